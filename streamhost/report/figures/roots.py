"""Poles and zeros in the plane, before and after rounding."""

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from streamhost.report.chart import Axis, Chart, Circle, FloatArray, Points
from streamhost.report.contents import Contents, Lane
from streamhost.report.figure import SIZES, Figure, columns_of, lane_panel, shown_in
from streamhost.report.words import grouped

METHOD = ("Crosses are poles, circles zeros: bronze as asked, iris with the coefficients as stored. Of a pair the upper one "
          "stands for both. The curve is the unit circle. No signal and no seed.")
WHOLE = 1.15
LEAST_HALF = 1e-4


def figures(contents: Contents) -> Iterator[Figure]:
    """One figure on a common part of the plane: that in which the poles lie."""
    found = shown_in(contents.lanes, "response")
    if not any(result.poles for _, result in found):
        return
    charts = {lane.number: _chart(lane, result, _window([each for _, each in found], len(found)))
              for lane, result in found if result.poles}
    panels = tuple(lane_panel(lane, charts.get(lane.number), f"No poles are told: {result.poles_reason or 'there are none'}.")
                   for lane, result in found)
    yield Figure(_caption(found), METHOD, panels)


def _caption(found: Sequence[tuple[Lane, Any]]) -> str:
    known = [(lane.number, result.stability) for lane, result in found if result.stability.largest_radius is not None]
    radii = grouped([(number, f"{stability.largest_radius:.6f}") for number, stability in known])
    verdicts = {stability.verdict for _, stability in known}
    verdict = f"with the coefficients as stored {'it is' if len(found) == 1 else 'all are'} {known[0][1].verdict}" \
        if len(verdicts) == 1 else grouped([(number, stability.verdict) for number, stability in known])
    return f"Poles and zeros: {verdict}. The largest pole radius is {radii}."


def _chart(lane: Lane, result: Any, window: tuple[float, float, float, float]) -> Chart:
    left, right, bottom, top = window
    zeros = [root for output in result.outputs for root in output.zeros]
    items: list[Points | Circle] = [Circle()]
    for shape, roots in (("zero", zeros), ("pole", result.poles)):
        items += [Points(f"{shape}-before", *_places(roots, "asked")), Points(shape, *_places(roots, "stored"))]
    said = f"Poles and zeros of realization {lane.number}: {result.stability.verdict}"
    wide = max(2.0 * WHOLE, right - left)
    return Chart(said, Axis(left, right, "", least=left - wide, most=right + wide),
                 Axis(bottom, top, "", least=bottom - wide, most=top + wide), tuple(items), equal=True)


def _places(roots: Sequence[Any], which: str) -> tuple[FloatArray, FloatArray]:
    there = [(getattr(root, f"{which}_real"), getattr(root, f"{which}_imaginary")) for root in roots
             if getattr(root, f"{which}_real") is not None]
    x = np.array([real for real, _ in there], dtype=np.float64)
    return x, np.abs(np.array([imaginary for _, imaginary in there], dtype=np.float64))


def _window(results: Sequence[Any], panels: int) -> tuple[float, float, float, float]:
    """The part of the plane around all poles, in the shape of a panel, so that both axes have one scale."""
    places = [_places(result.poles, which) for result in results for which in ("asked", "stored")]
    x, y = (np.concatenate([each[k] for each in places]) for k in (0, 1))
    angle = np.arctan2(y, x)
    x, y = np.append(x, np.cos(angle)), np.append(y, np.sin(angle))  # so that the distance from the circle is seen
    wide, high = SIZES[columns_of(panels)]
    shape = (wide - 60.0) / (high - 44.0)
    half_x, half_y = max(float(np.ptp(x)) / 2.0, LEAST_HALF) * 1.4, max(float(np.ptp(y)) / 2.0, LEAST_HALF) * 1.4
    half_y = max(half_y, half_x / shape)
    half_x = half_y * shape
    middle_x, middle_y = (float(x.max()) + float(x.min())) / 2.0, (float(y.max()) + float(y.min())) / 2.0
    return middle_x - half_x, middle_x + half_x, middle_y - half_y, middle_y + half_y
