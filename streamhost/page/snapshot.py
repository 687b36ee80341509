"""A moment of a sitting as the page shows it. Levels are decibels, None for silence."""

import math

import numpy as np

from streamhost.host.capturing import captured
from streamhost.host.figures import bin_ends_ns, decibels, guard_figures, lane_figures, run_figures
from streamhost.host.plan import changes_made
from streamhost.page.sitting import Sitting
from streamhost.page.spectra import FRAMES, MEAN, POINTS, Floats, noise_dbfs, recent, spectrum

ALARMS = ("card lost", "guard shut")
BEFORE_S, AFTER_S = 0.005, 0.012
LEAST_PERCENT, MOST_PERCENT = 0.1, 100.0

Document = dict[str, object]


def ledger(sitting: Sitting) -> Document:
    """What is written: numbers that change four times a second."""
    guard, said = guard_figures(sitting.shared, sitting.begins), sitting.said
    held = guard.held
    return {
        "sentence": _sentence(sitting), "lanes": [_lane(sitting, number) for number in range(len(sitting.lanes))],
        "output": {
            "state": f"{said}: {guard.reason}" if said == "guard shut" else said, "alarm": said.startswith(ALARMS),
            "silent": said != "sounding", "held": held,
            "ceiling": round(decibels(float(sitting.shared.control["ceiling"][0])), 1),
        },
        "blocks": _blocks(sitting), "notice": sitting.notice,
    }


def level(sitting: Sitting) -> Document:
    """What goes out: rms and peak of the last quarter of a second."""
    meters = sitting.shared.meters[0]
    return {"rms": finite(decibels(math.sqrt(2.0 * float(meters["shown_squares"])))),
            "peak": finite(decibels(float(meters["shown_peak"])))}


def finite(value: float, decimals: int = 1) -> float | None:
    return round(value, decimals) if math.isfinite(value) else None


def _sentence(sitting: Sitting) -> Document:
    return {
        "heard": sitting.heard + 1, "count": len(sitting.lanes), "before": sitting.before + 1, "source": sitting.source_said,
        "place": sitting.place_said, "monitor": sitting.monitor_db, "changeover": sitting.changeover,
        "differs": sitting.differs, "against": sitting.against, "raise": sitting.raise_db,
    }


def _lane(sitting: Sitting, number: int) -> Document:
    lane = sitting.lanes[number]
    realization, meters = lane.realization, sitting.shared.lanes[number]
    columns = lane.channels * len(realization.outputs)
    figures = lane_figures(sitting.shared, number, columns, sitting.rate)
    return {
        "title": sitting.titles[number],
        "about": f"{realization.form} · {realization.decomposition} · {realization.format.label}",
        "peak": finite(decibels(float(meters["shown_peak"]))), "noise": _noise(sitting, number),
        "saturated": figures.saturations + figures.wraps, "load": finite(figures.load_percent, 2),
        "state": "heard" if number == sitting.heard else "ready",
    }


def _noise(sitting: Sitting, number: int) -> float | None:
    """Of the last of what the lane added to its ideal."""
    lane = sitting.lanes[number]
    if lane.ideal is None or not len(sitting.shared.heard):
        return None
    added = recent(sitting.shared.added[number], int(sitting.shared.meters["frame"][0]), FRAMES, sitting.block)
    return finite(noise_dbfs(added[:, : lane.channels]))


def curves(sitting: Sitting) -> Document:
    """Spectra of the first channel: of what is heard, and of what the heard lane adds, in tenths of a decibel."""
    shared, heard = sitting.shared, sitting.heard
    if not len(shared.heard):
        return {}
    frame = int(shared.meters["frame"][0])
    found: Document = {"rate": sitting.rate, "points": POINTS, "mean": MEAN}
    rings = {"heard": shared.heard, **({"difference": shared.added[heard]} if sitting.lanes[heard].ideal is not None else {})}
    for name, ring in rings.items():
        found[name] = np.rint(10.0 * spectrum(recent(ring, frame, FRAMES, sitting.block)[:, 0])).astype(int).tolist()
    return found


def last_change(sitting: Sitting) -> Document | None:
    """What was heard around the last change and what the lane before gave, first channel; None before one has been run."""
    made = changes_made(sitting.shared, sitting.begins)
    if not made or not len(sitting.shared.heard):
        return None
    last = made[-1]
    before, after = (round(seconds * sitting.rate) for seconds in (BEFORE_S, AFTER_S))
    found = captured(sitting.shared, last.frame, (last.before, last.lane), before=before, after=after, block=sitting.block,
                     begins=sitting.begins)
    if found is None:
        return None
    heard, former = found.heard[:, 0], found.before[:, 0] * float(sitting.lanes[last.before].match)
    return {
        "frame": last.frame, "before": last.before + 1, "after": last.lane + 1, "changeover": last.changeover,
        "clipped": last.clipped, "first": found.first, "rate": sitting.rate,
        "peak": finite(100.0 * float(np.abs(np.nan_to_num(heard[-found.first :])).max()), 2),
        "apart": finite(decibels(float(np.abs(np.nan_to_num(heard - former))[-found.first :].max()))),
        "heard": _percents(heard), "former": _percents(former),
    }


def _percents(values: Floats) -> list[float]:
    """Of full scale, with five digits."""
    return [float(f"{value:.5g}") for value in 100.0 * np.nan_to_num(values)]


def _blocks(sitting: Sitting) -> Document:
    """Block times in percent of the deadline: a comb of (place, how many), two marks, and how many took over half."""
    shared = sitting.shared
    figures = run_figures(shared, sitting.block, sitting.rate)
    deadline = sitting.block / sitting.rate * 1e9
    counts = shared.histogram.copy()
    found = counts.nonzero()[0]
    ends = bin_ends_ns()[found] / deadline * 100.0
    comb = [[float(f"{end:.4g}"), int(count)] for end, count in zip(ends, counts[found], strict=True)
            if LEAST_PERCENT <= end <= MOST_PERCENT]
    percent = {name: float(figures[key]) / deadline * 1e5 for name, key in  # type: ignore[arg-type]
               (("nearly", "step_p999_us"), ("worst", "step_max_us"))}
    return {"comb": comb, "blocks": figures["blocks"], "half": figures["blocks_over_half"],
            "input_gaps": figures["input_gaps"], "output_gaps": figures["output_gaps"],
            **{name: float(f"{value:.3g}") for name, value in percent.items()}}
