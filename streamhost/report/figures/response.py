"""The response as asked and as stored, how far one is from the other, and the delays."""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from streamhost.report.chart import Axis, Chart, Edge, FloatArray, Line
from streamhost.report.contents import Contents, Lane
from streamhost.report.figure import Figure, lane_panel, shown_in, with_ghost
from streamhost.report.words import grouped, hertz, listed, number, short

JUDGED_DB = 40.0
LEAST_SPAN_DB = 0.01
MOST_LIMITS = 12.0
"""A deviation is shown up to so many times its limit."""


@dataclass(frozen=True)
class Shown:
    """A realization's response at one output, where there is one."""

    lane: Lane
    result: Any
    curves: Any
    name: str

    @property
    def has_response(self) -> bool:
        return bool(np.isfinite(self.curves.stored).all())


def figures(contents: Contents) -> Iterator[Figure]:
    """Magnitude, deviation and group delay at each output."""
    found = shown_in(contents.lanes, "response")
    outputs = dict.fromkeys(curves.output for _, result in found for curves in result.outputs)
    for output in outputs:
        shown = [Shown(lane, result, curves, output) for lane, result in found
                 for curves in result.outputs if curves.output == output]
        yield _magnitude(contents, shown)
        yield _deviation(contents, shown)
        yield _delay(contents, shown)


def decibels(response: FloatArray) -> FloatArray:
    with np.errstate(divide="ignore"):
        return np.asarray(20.0 * np.log10(np.abs(response)))


def frequency_axis(contents: Contents, hertz_seen: FloatArray) -> Axis:
    low, high = contents.band
    positive = hertz_seen[hertz_seen > 0.0]
    low = max(low, float(positive.min()))
    return Axis(low, high, "Hz", True, float(positive.min()), float(hertz_seen.max()))


def _told(said: list[tuple[int, str]], lanes: int) -> str:
    return grouped(said) if lanes == len(said) or len(said) > 1 else f"{said[0][1]} for {said[0][0]}"


def _of(output: str) -> str:
    return f" at {output}" if output else ""


def _none(one: Shown) -> str:
    return next((band.reason for band in one.result.bands if band.reason), "No response is told.")


def _magnitude(contents: Contents, shown: list[Shown]) -> Figure:
    asked = [decibels(one.curves.asked) for one in shown]
    top = 6.0 * np.ceil((max(float(each.max()) for each in asked) + 1.0) / 6.0)
    bottom = top - min(72.0, 6.0 * np.ceil((top - min(float(_inside(contents, one, each).min())
                                                      for one, each in zip(shown, asked, strict=True))) / 6.0 + 1.0))
    charts = {}
    for one in shown:
        if one.has_response:
            x = frequency_axis(contents, one.curves.hertz)
            charts[one.lane.number] = Chart(
                f"Magnitude of realization {one.lane.number}{_of(one.name)} against frequency", x,
                Axis(bottom, top, "dB", least=-160.0, most=top + 20.0), (
                    Line("heard", one.curves.hertz, decibels(one.curves.stored), str(one.lane.number)),
                    Line("before", one.curves.hertz, decibels(one.curves.asked), "" if len(shown) > 2 else "asked"),
                ))
    names = [str(one.lane.number) for one in shown if not one.has_response]
    gone = f" {listed(names)} {'has' if len(names) == 1 else 'have'} no response: not stable." if names else ""
    caption = f"Magnitude{_of(shown[0].name)}: dashed as asked, solid with the coefficients as stored.{gone}"
    return Figure(caption, _method(contents), tuple(
        lane_panel(one.lane, charts.get(one.lane.number), _none(one)) for one in shown))


def _inside(contents: Contents, one: Shown, level: FloatArray) -> FloatArray:
    low, high = contents.band
    inside = level[(one.curves.hertz >= low) & (one.curves.hertz <= high) & np.isfinite(level)]
    return inside if len(inside) else np.zeros(1)


def _method(contents: Contents) -> str:
    low, high = contents.band
    return (f"From the state space, exact coefficients against those stored; no signal and no seed. Band {hertz(low)} to "
            f"{hertz(high)}.")


def _deviations(one: Shown) -> FloatArray:
    """Stored over asked, where it is judged: elsewhere a gap."""
    asked = decibels(one.curves.asked)
    judged = asked >= asked.max() - JUDGED_DB
    return np.where(judged, decibels(one.curves.stored) - np.where(judged, asked, 0.0), np.nan)


def _deviation(contents: Contents, shown: list[Shown]) -> Figure:
    limits = [verdict.allowed for one in shown for verdict in one.lane.verdicts
              if verdict.key == "response_deviation_db" and verdict.output in ("", one.name)]
    limit = min(limits, default=None)
    found = {one.lane.number: _band(one) for one in shown}
    largest = max([abs(each) for each in found.values() if each is not None], default=0.0)
    span = max(LEAST_SPAN_DB, 1.25 * largest)
    if limit is not None:
        span = min(max(span, 1.5 * limit), MOST_LIMITS * limit)
    charts = {one.lane.number: _deviation_chart(contents, one, span, limit) for one in shown if one.has_response}
    charts = with_ghost(contents, charts)
    said = [(lane, f"{number(each, 3)} dB") for lane, each in found.items() if each is not None]
    allowed = "" if limit is None else f"; {short(limit)} dB is allowed"
    told = f"moves the response{_of(shown[0].name)} at most by {_told(said, len(shown))}{allowed}" if said else \
        "left no response to compare"
    caption = f"Rounding the coefficients {told}."
    return Figure(caption, f"20 lg of stored over asked, where the filter is within 40 dB of its maximum. {_method(contents)}",
                  tuple(lane_panel(one.lane, charts.get(one.lane.number), _none(one)) for one in shown))


def _band(one: Shown) -> float | None:
    found = [band.deviation_db for band in one.result.bands if band.output == one.name and band.deviation_db is not None]
    return max(found, default=None)


def _deviation_chart(contents: Contents, one: Shown, span: float, limit: float | None) -> Chart:
    edges = () if limit is None else (Edge("y", limit, 1, f"at most {short(limit)} dB"), Edge("y", -limit, -1))
    most = _band(one)
    return Chart(
        f"Deviation of realization {one.lane.number} from the response asked for, at most {number(most, 3)} dB",
        frequency_axis(contents, one.curves.hertz), Axis(-span, span, "dB", least=-1000 * span, most=1000 * span),
        (*edges, Line("heard", one.curves.hertz, _deviations(one), str(one.lane.number))))


def _delay(contents: Contents, shown: list[Shown]) -> Figure:
    judged = [each for one in shown if one.has_response
              for each in _judged(contents, one, one.curves.asked_delay_frames, one.curves.stored_delay_frames)]
    finite = np.concatenate([each[np.isfinite(each)] for each in judged]) if judged else np.zeros(1)
    low, high = (float(finite.min()), float(finite.max())) if len(finite) else (0.0, 0.0)
    margin = max(1.0, 0.08 * (high - low))
    axis = Axis(low - margin, high + margin, "frames", least=low - 20.0 * margin, most=high + 20.0 * margin)
    charts = {}
    for one in shown:
        if one.has_response:
            asked, stored = _judged(contents, one, one.curves.asked_delay_frames, one.curves.stored_delay_frames, np.nan)
            charts[one.lane.number] = Chart(
                f"Group delay of realization {one.lane.number}{_of(one.name)} against frequency",
                frequency_axis(contents, one.curves.hertz), axis,
                (Line("heard", one.curves.hertz, stored, str(one.lane.number)),
                 Line("before", one.curves.hertz, asked, "" if len(shown) > 2 else "asked")))
    said = [(one.lane.number, f"{number(one.curves.latency_frames, 2)} frames ({number(one.curves.latency_ms, 3)} ms)")
            for one in shown if one.curves.latency_frames is not None]
    latency = f" Latency: {_told(said, len(shown))}." if said else ""
    caption = f"Group delay{_of(shown[0].name)}: dashed as asked, solid as stored.{latency}"
    method = ("Where the filter is within 40 dB of its maximum. Latency: the delay averaged over the power that passes. "
              + _method(contents))
    return Figure(caption, method, tuple(
        lane_panel(one.lane, charts.get(one.lane.number), _none(one)) for one in shown))


def _judged(
    contents: Contents, one: Shown, asked: FloatArray, stored: FloatArray, gap: float | None = None
) -> list[FloatArray]:
    """Both delays where the response is judged, with gaps elsewhere, or without what is elsewhere."""
    level = decibels(one.curves.asked)
    seen = level >= level.max() - JUDGED_DB
    if gap is not None:
        return [np.where(seen, each, gap) for each in (asked, stored)]
    low, high = contents.band
    seen &= (one.curves.hertz >= low) & (one.curves.hertz <= high)
    return [asked[seen], stored[seen]]
