"""What comes after an overflow: how far a realization is from its ideal when the burst has ended."""

from collections.abc import Iterator
from typing import Any

import numpy as np

from streamhost.report.chart import Axis, Chart, Edge, FloatArray, Line
from streamhost.report.contents import Contents, Lane
from streamhost.report.figure import Figure, lane_panel, shown_in
from streamhost.report.words import listed, number, several

METHOD = ("The largest magnitude of realized minus ideal, from the start of the burst after which it takes longest. Bursts: "
          "the worst cases of registers, a constant, the extremes in turn, and noise, all at full scale. Hatched: more than "
          "roundings alone can make.")
STRETCHES = 1000
DEEPEST = -200.0


def figures(contents: Contents) -> Iterator[Figure]:
    """One figure of the realizations that overflowed."""
    found = [(lane, result) for lane, result in shown_in(contents.lanes, "overflow") if result.recoveries]
    if not found:
        return
    worst = [(lane, _worst(result)) for lane, result in found]
    longest = max(len(one.difference) for _, one in worst) / contents.rate
    axis = Axis(0.0, longest, "s")
    top = max(float(np.nanmax(_level(one.difference))) for _, one in worst) + 6.0
    bottom = min(one.allowed_dbfs for _, one in worst) - 20.0
    panels = tuple(lane_panel(lane, _chart(lane, one, contents.rate, axis, Axis(bottom, top, "dBFS", least=DEEPEST)))
                   for lane, one in worst)
    yield Figure(_caption(worst, contents), f"{METHOD} Seed {found[0][1].seed}.", panels)


def _worst(result: Any) -> Any:
    """The recovery that oscillates, else the longest."""
    return max(result.recoveries, key=lambda one: (one.oscillates, one.recovery_frames is None, one.recovery_frames or 0))


def _caption(worst: list[tuple[Lane, Any]], contents: Contents) -> str:
    said = []
    for lane, one in worst:
        if one.oscillates:
            period = f" with a period of {several(one.period_frames, 'frame')}" if one.period_frames else ""
            said.append(f"{lane.number} oscillates{period} after {one.burst}, {number(one.peak_dbfs)} dBFS off")
        elif one.recovery_s is None:
            said.append(f"{lane.number} had not joined its ideal by the end of the run after {one.burst}")
        else:
            said.append(f"{lane.number} joins its ideal {number(1000.0 * one.recovery_s)} ms after {one.burst}")
    return f"After an overflow: {listed(said)}."


def _level(difference: FloatArray) -> FloatArray:
    edges = np.unique(np.linspace(0, len(difference), STRETCHES + 1).astype(np.int64))
    peaks = np.maximum.reduceat(np.abs(difference).max(axis=1), edges[:-1])
    with np.errstate(divide="ignore"):
        return np.asarray(np.maximum(20.0 * np.log10(peaks), DEEPEST))


def _chart(lane: Lane, one: Any, rate: float, x: Axis, y: Axis) -> Chart:
    level = _level(one.difference)
    seconds = np.linspace(0.0, len(one.difference) / rate, len(level))
    said = f"How far realization {lane.number} is from its ideal after {one.burst}"
    return Chart(said, x, y, (Edge("y", one.allowed_dbfs, 1), Line("heard", seconds, level, str(lane.number))))
