"""What a comparison says: two ledgers and sentences for a reader, the same figures for a program."""

from collections.abc import Callable, Iterator, Sequence
from pathlib import Path

from streamhost.commands.common import GAP, Cell, Column, ledger, printable
from streamhost.commands.compare import Compared
from streamhost.commands.verdict_text import SIGNAL, miss
from streamhost.files import AudioInfo
from streamhost.formats import Float, Format
from streamhost.measure import Figures
from streamhost.measure.limits import SEED
from streamhost.presets import Preset
from streamhost.presets.realizing import Refusal

LONGEST_TITLE = 56
LEAST_TITLE = 8
MOST_NUMBERED = 8

NOISE = (
    Column("lane"), Column("form · decomposition · format"), Column("noise", "dBFS", 1), Column("95 %", "± dB", 2),
    Column("predicted", "dBFS", 1), Column("white", "model"), Column("A-weighted", "dBFS", 1),
    Column("full band", "dBFS", 1),
)
REST = (
    Column("response", "dB off", 3), Column("at", "Hz", 1), Column("poles", "unstable"), Column("saturated"),
    Column("wrapped"), Column("accumulator", "overflows"), Column("peak", "dBFS", 1), Column("mean", "LSB", 1),
    Column("multiply"), Column("add"), Column("words"), Column("time", "ns/frame", 1), Column("raise", "dB"),
)
METHOD = (
    "Noise: output minus ideal, without its mean, 20 Hz to 20 kHz, once settled. A full-scale sine reads 0 dBFS.",
    "Response: the largest deviation by coefficient rounding, where the filter is within 40 dB of its maximum.",
)


def text(compared: Sequence[Compared], info: AudioInfo, refusals: Sequence[Refusal] = ()) -> str:
    """The whole report for a terminal; `refusals`: of forms that were sought."""
    paragraphs = [
        _ledger(NOISE, compared, _noise_row),
        _ledger(REST, compared, _rest_row),
        " ".join(refused(refusals)),
        "\n".join(_verdict(compared)),
        "\n".join(_sums(compared)),
        "\n".join(remarks(compared)),
        "\n".join(_listening(compared)),
        "\n".join((conditions(compared, info), *METHOD)),
    ]
    return "\n\n".join(paragraph for paragraph in paragraphs if paragraph)


def _ledger(columns: Sequence[Column], compared: Sequence[Compared], row: Callable[[Compared, Figures], list[Cell]]) -> str:
    """A row for each realization, or, of several outputs, for each of them, led by the number and the output's name."""
    if all(len(one.measured.outputs) == 1 for one in compared):
        return ledger(columns, [row(one, figures) for _, one, figures in _lines(compared)])
    named = [[name, *row(one, figures)] for name, one, figures in _lines(compared)]
    return ledger([Column(""), *columns], named, numbered=False)


def _lines(compared: Sequence[Compared]) -> Iterator[tuple[str, Compared, Figures]]:
    """What each line of a table is called: the number of the realization, and the name of one of several outputs."""
    for number, one in enumerate(compared, 1):
        several = len(one.measured.outputs) > 1
        for figures in one.measured.outputs:
            yield f"{number} {figures.name}" if several else str(number), one, figures


def _once(one: Compared, figures: Figures, cells: list[Cell]) -> list[Cell]:
    """What holds for a realization as a whole stands in its first line only."""
    return cells if figures is one.measured.outputs[0] else [""] * len(cells)


def _noise_row(one: Compared, figures: Figures) -> list[Cell]:
    noise, prediction = figures.noise, figures.prediction
    white = {True: "holds", False: "fails", None: None}[figures.white.holds]
    predicted = prediction.dbfs if prediction is not None else None
    return [
        *_once(one, figures, [short_title(one.preset), one.label]),
        noise.dbfs, noise.interval_db, predicted, white, noise.a_dbfs, noise.full_dbfs,
    ]


def short_title(preset: Preset) -> str:
    """Shortened in the preset's own part: what was varied tells rows apart."""
    own = preset.own_title
    varied = preset.title[len(own) :]
    room = max(LEAST_TITLE, LONGEST_TITLE - len(varied))
    return (own if len(own) <= room else own[: room - 1] + "…") + varied


def _rest_row(one: Compared, figures: Figures) -> list[Cell]:
    measured = one.measured
    tally, counts = measured.tally, measured.counts
    return [
        figures.deviation.db, figures.deviation.hz,
        *_once(one, figures, [measured.unstable, tally.saturations, tally.wraps, tally.accumulator_overflows]),
        figures.peak_dbfs, figures.dc_lsb,
        *_once(one, figures, [counts.multiplications, counts.additions, counts.delays, measured.ns_per_frame]),
        figures.difference_gain_db,
    ]


def refused(refusals: Sequence[Refusal], done: str = "compared") -> Iterator[str]:
    """A sentence for each reason for which forms are not among those compared, or with which else was `done`."""
    by_reason: dict[str, list[str]] = {}
    for each in refusals:
        by_reason.setdefault(each.reason, []).append(each.preset.form)
    if by_reason:
        yield f"Not {done}, for they cannot carry this filter:"
    for reason, forms in by_reason.items():
        yield f"{', '.join(dict.fromkeys(forms))}: {reason}."


def refused_document(refusals: Sequence[Refusal]) -> list[dict[str, str]]:
    """The same for a program."""
    return [{"form": each.preset.form, "title": each.preset.title, "reason": each.reason} for each in refusals]


def _verdict(compared: Sequence[Compared]) -> Iterator[str]:
    asked = [one for one in compared if one.verdicts]
    if not asked:
        return
    met = sum(not one.misses for one in asked)
    others = [str(number) for number, one in enumerate(compared, 1) if not one.verdicts]
    rest = f"; {', '.join(others)} {'states' if len(others) == 1 else 'state'} none" if others else ""
    yield f"{met} of {len(asked)} with limits {'meets' if met == 1 else 'meet'} every limit{rest}."
    yield from misses(compared)


def misses(compared: Sequence[Compared]) -> Iterator[str]:
    """A sentence for each realization that does not meet its limits."""
    for number, one in enumerate(compared, 1):
        if one.misses:
            yield f"{number} misses " + "; ".join(miss(verdict) for verdict in one.misses) + "."


def _sums(compared: Sequence[Compared]) -> Iterator[str]:
    """How far the outputs together are from what they add up to as asked."""
    for number, one in enumerate(compared, 1):
        if (deviation := one.measured.sum_deviation) is not None:
            *others, last = (figures.name for figures in one.measured.outputs)
            names = f"{', '.join(others)} and {last}"
            if deviation.db is None:
                yield f"{number}: no figure for the sum of {names}: {deviation.reason}."
            else:
                moved = f"by {deviation.db:.3f} dB, at {deviation.hz:g} Hz"
                yield f"{number}: coefficient rounding moves the sum of {names} {moved}."


def remarks(compared: Sequence[Compared]) -> Iterator[str]:
    """Why figures are missing, what they are worth, and what is dangerous."""
    lines = list(_lines(compared))
    for number, one in enumerate(compared, 1):
        measured = one.measured
        if measured.unstable:
            since = one.realization.unstable_since
            yield f"{number} is unstable {since}: {_poles(measured.unstable)} on or outside the unit circle."
        own = [(name, figures) for name, other, figures in lines if other is one]
        yield from (f"{name}{remark}." for name, figures in own for remark in _noise_remarks(figures, one.realization.format))
        if isinstance(one.realization.format, Float) and any(figures.prediction is not None for _, figures in own):
            yield f"{number}: in floating point the predicted noise is an estimate."
        for hazard in one.realization.hazards:
            yield f"{number}, hazard: {hazard}"


def _noise_remarks(figures: Figures, format: Format) -> Iterator[str]:
    noise, white, floating = figures.noise, figures.white, isinstance(format, Float)
    if figures.channel is not None:
        yield f": noise is told of channel {figures.channel}, the worst"
    if noise.reason:
        yield f" has no noise figure{'' if floating else ' and no verdict on the white model'}: {noise.reason}"
        return
    if noise.excluded:
        yield f": {100 * noise.excluded:.2f} % of the frames do not count: an overflow was near"
    if white.holds is False:
        yield f": the white model does not hold here: {white.reason}"
    elif white.reason and not floating:
        yield f": whether the white model holds is not known: {white.reason}"


def _poles(count: int) -> str:
    return "1 pole lies" if count == 1 else f"{count} poles lie"


def _listening(compared: Sequence[Compared]) -> Iterator[str]:
    files = [pair for one in compared for pair in one.files or [None] * len(one.measured.outputs)]
    for (name, _, figures), pair in zip(_lines(compared), files, strict=True):
        if pair is not None:
            yield printable(f"{name}{GAP}{pair[0]}{GAP}{_difference(pair[1], figures.difference_gain_db)}")


def _difference(path: Path | None, gain: int | None) -> str:
    if path is None:
        return "no difference written: it ran away"
    if gain is None:
        return f"{path}{GAP}is silent"
    return f"{path}{GAP}" + (f"raise by {gain} dB" if gain >= 0 else f"loud: lower by {-gain} dB")


def conditions(compared: Sequence[Compared], info: AudioInfo) -> str:
    ideals: dict[str, list[str]] = {}
    for number, one in enumerate(compared, 1):
        ideals.setdefault(one.measured.ideal, []).append(str(number))
    if len(ideals) == 1 and len(compared) > MOST_NUMBERED:
        ideals = {ideal: ["all"] for ideal in ideals}
    said = "; ".join(f"{ideal} for {', '.join(numbers)}" for ideal, numbers in ideals.items())
    channels = "1 channel" if info.channels == 1 else f"{info.channels} channels"
    sentences = [
        f"Input: {printable(info.path.name)}, {info.seconds:.2f} s, {channels}, {info.rate} Hz.",
        f"The ideal ran in {said}.",
    ]
    if seed_of(compared) is not None:
        sentences.append(f"Limits were checked on {SIGNAL}.")
    return " ".join(sentences)


def seed_of(compared: Sequence[Compared]) -> int | None:
    """The seed of the random signal that was used; None where none was."""
    return SEED if any(one.verdicts for one in compared) else None


def document(
    compared: Sequence[Compared], info: AudioInfo, source: str, refusals: Sequence[Refusal] = ()
) -> dict[str, object]:
    """The figures under keys that are spelt with their unit; those not given are None. `source` is the input as asked for."""
    return {
        "rate": info.rate, "input": source, "seed": seed_of(compared),
        "realizations": [_figures(one) for one in compared],
        "refused": refused_document(refusals),
    }


def _figures(one: Compared) -> dict[str, object]:
    """Of one output all figures side by side; of several a list of those of each."""
    measured, realization = one.measured, one.realization
    tally, counts = measured.tally, measured.counts
    outputs = [{**_figures_of(figures), **files} for figures, files in zip(measured.outputs, _files(one), strict=True)]
    found: dict[str, object] = {
        "preset": one.preset.source.name,
        "title": one.preset.title,
        "decomposition": realization.decomposition,
        "form": realization.form,
        "format": realization.format.label,
        **(outputs[0] if len(outputs) == 1 else {}),
        "unstable": measured.unstable,
        "saturations": tally.saturations,
        "wraps": tally.wraps,
        "accumulator_overflows": tally.accumulator_overflows,
        "multiplications": counts.multiplications,
        "additions": counts.additions,
        "delays": counts.delays,
        "ns_per_frame": measured.ns_per_frame,
    }
    if measured.sum_deviation is not None:
        found["sum_response_deviation_db"] = measured.sum_deviation.db
        found["sum_response_deviation_hz"] = measured.sum_deviation.hz
    if len(outputs) > 1:
        found["outputs"] = [{"name": each.name, **own} for each, own in zip(measured.outputs, outputs, strict=True)]
    return found


def _figures_of(figures: Figures) -> dict[str, object]:
    noise = figures.noise
    return {
        "response_deviation_db": figures.deviation.db,
        "response_deviation_hz": figures.deviation.hz,
        "leak_db": figures.deviation.leak_db,
        "noise_dbfs": noise.dbfs,
        "noise_interval_db": noise.interval_db,
        "noise_full_dbfs": noise.full_dbfs,
        "noise_a_dbfs": noise.a_dbfs,
        "noise_predicted_dbfs": figures.prediction.dbfs if figures.prediction is not None else None,
        "white_model_holds": figures.white.holds,
        "dc_lsb": figures.dc_lsb,
        "peak_dbfs": figures.peak_dbfs,
        "difference_gain_db": figures.difference_gain_db,
        **({"noise_channel": figures.channel} if figures.channel is not None else {}),
    }


def _files(one: Compared) -> list[dict[str, object]]:
    if not one.files:
        return [{"output": None, "difference": None}] * len(one.measured.outputs)
    return [{"output": str(output), "difference": str(difference) if difference is not None else None}
            for output, difference in one.files]
