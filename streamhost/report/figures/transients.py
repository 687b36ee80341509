"""Changes while sound goes on: what is heard, against the old and the new filter."""

from collections.abc import Iterator
from typing import Any

import numpy as np

from streamhost.report.chart import Axis, Chart, Line
from streamhost.report.contents import Contents, Lane
from streamhost.report.figure import Figure, Panel, shown_in
from streamhost.report.words import grouped, listed, number

METHOD = ("The worst change of each changeover; zero is the change. Iris: heard. Bronze, dashed: the old filter had it gone "
          "on. Thin: the new one had it run all along. Click: quasi-peak of what differs, ITU-R BS.468-4, a full-scale sine of "
          "1 kHz being 0.")


def figures(contents: Contents) -> Iterator[Figure]:
    """Of one realization a panel for each changeover, of several one for each, by the changeover that is judged."""
    found = [(lane, result) for lane, result in shown_in(contents.lanes, "transients") if result.traces]
    if not found:
        return
    alone = len(contents.lanes) == 1
    shown = [(lane, result, trace) for lane, result in found for trace in result.traces
             if alone or trace.changeover == result.changeover]
    heads = [trace.changeover if alone else lane.short for lane, _, trace in shown]
    panels = tuple(Panel(head, str(lane.number), _chart(lane, trace, contents.rate))
                   for head, (lane, _, trace) in zip(heads, shown, strict=True))
    yield Figure(_caption(found), METHOD, panels)


def _caption(found: list[tuple[Lane, Any]]) -> str:
    said = [(lane.number, f"{number(result.click_468_dbfs)} dBFS by {result.changeover}, {result.change}")
            for lane, result in found if result.click_468_dbfs is not None]
    missing = [str(lane.number) for lane, result in found if result.click_468_dbfs is None]
    told = f"The worst click of a change: {grouped(said)}." if said else "Changes while sound goes on."
    return f"{told} No figure for {listed(missing)}." if missing and said else told


def _chart(lane: Lane, trace: Any, rate: float) -> Chart:
    ms = (np.arange(len(trace.heard)) - trace.at) * 1000.0 / rate
    levels = np.concatenate((trace.heard, trace.before, trace.target)) * 100.0
    low, high = float(levels.min()), float(levels.max())
    margin = max(0.1 * (high - low), 1e-6)
    said = f"Change of realization {lane.number} by {trace.changeover}: {trace.change}, on {trace.signal}"
    return Chart(said, Axis(float(ms[0]), float(ms[-1]), "ms"), Axis(low - margin, high + margin, "% of full scale"), (
        Line("difference", ms, trace.target * 100.0), Line("heard", ms, trace.heard * 100.0, str(lane.number)),
        Line("before", ms, trace.before * 100.0)))
