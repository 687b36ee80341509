"""Limit cycles: the worst that was found, as the output has it."""

from collections.abc import Iterator
from typing import Any

import numpy as np

from streamhost.report.chart import Axis, Chart, Line
from streamhost.report.contents import Contents, Lane
from streamhost.report.figure import Figure, lane_panel, shown_in
from streamhost.report.words import grouped, number, sentence

METHOD = ("The worst cycle without input, at the output, in steps of its word: a period, repeated. Proven: all states that the "
          "bound leaves were walked. Found: the largest of a search from seeded states.")
LEAST_FRAMES, MOST_FRAMES = 48, 4096
LEAST_STEPS = 1.5


def figures(contents: Contents) -> Iterator[Figure]:
    """One figure; each panel has its own scale, since words differ."""
    found = shown_in(contents.lanes, "limit_cycles")
    if not found:
        return
    panels = tuple(lane_panel(lane, _chart(lane, result), _none(result)) for lane, result in found)
    seeds = ", ".join(dict.fromkeys(str(result.seed) for _, result in found))
    yield Figure(f"Limit cycles: {grouped([(lane.number, _said(result)) for lane, result in found])}.",
                 f"{METHOD} Seed {seeds}.", panels)


def _said(result: Any) -> str:
    if result.overflow_lsb:
        return f"an overflow oscillation of {result.overflow_lsb:,} LSB"
    if result.proven_lsb is not None:
        return f"{result.proven_lsb:,} LSB at most (proven)" if result.proven_lsb else "none (proven)"
    if result.found_lsb is not None:
        bound = f" (none above {number(result.proven_bound_lsb)}, proven)" if result.proven_bound_lsb is not None else ""
        return f"{result.found_lsb:,} LSB found{bound}" if result.found_lsb else f"none found{bound}"
    return "not asked"


def _none(result: Any) -> str:
    said = _said(result)
    return f"{sentence(said)} {sentence(result.reason)}" if result.reason and said == "not asked" else said


def _chart(lane: Lane, result: Any) -> Chart | None:
    """In steps of the output's word; None where there is no cycle to be seen."""
    worst = result.worst
    if worst is None or not worst.output_lsb or not len(worst.wave):
        return None
    period = worst.wave[: worst.period_frames]
    frames = min(max(2 * len(period), LEAST_FRAMES), MOST_FRAMES)
    steps = np.resize(period, frames) * worst.output_lsb / float(np.abs(worst.wave).max())
    span = max(LEAST_STEPS, 1.2 * worst.output_lsb)
    said = f"Limit cycle of realization {lane.number}: {worst.output_lsb} LSB, period {worst.period_frames} frames"
    return Chart(said, Axis(0.0, float(frames), "frames", least=0.0), Axis(-span, span, "LSB", least=-4 * span, most=4 * span),
                 (Line("heard", np.repeat(np.arange(frames + 1.0), 2)[1:-1], np.repeat(steps, 2), str(lane.number)),))
