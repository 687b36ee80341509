"""A chart as SVG that needs no script, and as data for the script that zooms it.

What both draw alike is kept small: every item is one path. Colours and strokes are the page's, by class.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import isfinite, log10
from typing import Any

import numpy as np

from streamhost.report.chart import Axis, Chart, Circle, Edge, FloatArray, Line, Points, thinned, ticks
from streamhost.report.words import escape

NARROW, GLYPH, WIDE = 4.6, 8.3, 11.0
"""Widths of a point, of most characters and of a minus or an M at 13 px, in a wide font."""
TOP, BOTTOM = 20.0, 24.0
X_ROOM, Y_ROOM = 52.0, 28.0
LABEL_APART = 16.0
MARKS_APART = 12.0
MOST_LEFT = 0.42
STATIC_POINTS, ZOOMED_POINTS = 2, 6
"""Points of a curve that a pixel is worth, as it stands and for zooming."""
STRIP = 10.0
"""Of hatching along a limit."""

SHAPES = {
    "lozenge": "m-5 0l5-5 5 5-5 5z",
    "pole": "m-4.5-4.5l9 9m0-9l-9 9",
    "pole-before": "m-4.5-4.5l9 9m0-9l-9 9",
    "zero": "m-4.5 0a4.5 4.5 0 1 0 9 0a4.5 4.5 0 1 0-9 0",
    "zero-before": "m-4.5 0a4.5 4.5 0 1 0 9 0a4.5 4.5 0 1 0-9 0",
    "tick-l1": "m0-9v18",
    "tick-sine": "m0-5v10",
    "tick-noise": "m0-2v4",
}


@dataclass(frozen=True)
class Box:
    """Where the plot lies in its drawing, in px."""

    left: float
    top: float
    right: float
    bottom: float
    wide: float
    high: float


def width(text: str) -> float:
    """About what a text takes at 13 px."""
    return sum(NARROW if each in ".,: il" else WIDE if each in "\N{MINUS SIGN}mMwW∞" else GLYPH for each in text)


def box_of(chart: Chart, wide: float, high: float) -> Box:
    """Room for the names of ticks at the left, for those of curves at the right."""
    bottom = high - BOTTOM
    texts = chart.y.rows or [text for _, text in ticks(chart.y, bottom - TOP, Y_ROOM, unit=False)]
    left = max(chart.left, max([width(text) for text in texts], default=0.0) + 8.0)
    labels = [width(item.label) for item in chart.items if isinstance(item, Line) and item.label]
    right = wide - (max(labels) + 8.0 if labels else 8.0)
    return Box(min(left, MOST_LEFT * wide), TOP, right, bottom, wide, high)


def place(axis: Axis, value: FloatArray | float, start: float, end: float) -> Any:
    """Where values of an axis lie between two ends, in px."""
    if axis.log:
        return start + (np.log10(value) - log10(axis.low)) / log10(axis.high / axis.low) * (end - start)
    return start + (value - axis.low) / (axis.high - axis.low) * (end - start)


def chart_svg(chart: Chart, key: str, wide: float, high: float) -> str:
    """The drawing; `key` is its own among all of a page."""
    box = box_of(chart, wide, high)
    pieces = [
        f'<svg xmlns="http://www.w3.org/2000/svg" class="chart" data-key="{key}" viewBox="0 0 {wide:g} {high:g}"',
        f' role="img" tabindex="0" aria-label="{escape(chart.said)}"><clipPath id="{key}-clip">',
        f'<rect x="{box.left:g}" y="{box.top:g}" width="{box.right - box.left:g}" ',
        f'height="{box.bottom - box.top:g}"/></clipPath>',
        '<g class="scale">', *_scale(chart, box), "</g>",
        f'<g class="items" clip-path="url(#{key}-clip)">', *(_item(chart, item, box) for item in chart.items), "</g>",
        '<g class="words">', *_words(chart, box), "</g>", "</svg>",
    ]
    return "".join(pieces)


def _scale(chart: Chart, box: Box) -> Iterator[str]:
    """Grid, frame and the texts of ticks."""
    grid, texts = [], []
    for value, text in ticks(chart.x, box.right - box.left, X_ROOM):
        x = place(chart.x, value, box.left, box.right)
        grid.append(f"M{x:.1f} {box.top:g}V{box.bottom:g}")
        anchor = "end" if x + width(text) / 2 > box.wide else "middle"
        at = box.wide - 1 if anchor == "end" else x
        texts.append(f'<text x="{at:.1f}" y="{box.bottom + 17:g}" text-anchor="{anchor}">{escape(text)}</text>')
    for value, text in _y_ticks(chart.y, box):
        y = place(chart.y, value, box.bottom, box.top)
        grid.append(f"M{box.left:g} {y:.1f}H{box.right:g}")
        texts.append(f'<text x="{box.left - 6:g}" y="{y + 4.5:.1f}" text-anchor="end">{escape(text)}</text>')
    unit = f'<text x="0" y="11">{escape(chart.y.unit)}</text>' if chart.y.unit else ""
    yield f'<path class="grid" d="{"".join(grid)}"/>'
    yield f'<path class="frame" d="M{box.left:g} {box.top:g}V{box.bottom:g}H{box.right:g}"/>'
    yield from texts
    yield unit


def _y_ticks(axis: Axis, box: Box) -> list[tuple[float, str]]:
    if axis.rows:
        return [(float(k), shortened(name, box.left - 8.0)) for k, name in enumerate(axis.rows)]
    return ticks(axis, box.bottom - box.top, Y_ROOM, unit=False)


def shortened(name: str, room: float) -> str:
    """A name in so many px."""
    while width(name) > room and len(name) > 1:
        name = name.removesuffix("…")[:-1] + "…"
    return name


def _item(chart: Chart, item: Line | Points | Edge | Circle, box: Box) -> str:
    if isinstance(item, Line):
        x, y = thinned(item.x, item.y, STATIC_POINTS * int(box.right - box.left), log=chart.x.log)
        return f'<path class="line {item.role}" d="{_line_path(chart, x, y, box)}"/>'
    if isinstance(item, Points):
        x, y = _pixels(chart, item.x, item.y, box)
        inside = np.isfinite(x) & np.isfinite(y)
        places = zip(x[inside].tolist(), y[inside].tolist(), strict=True)
        marks = "".join(f"M{a:.1f} {b:.1f}{SHAPES[item.shape]}" for a, b in _spread(item.shape, list(places)))
        return f'<path class="point {item.shape}" d="{marks}"/>'
    if isinstance(item, Edge):
        return _edge(chart, item, box)
    return f'<path class="circle" d="{_line_path(chart, *unit_circle(), box)}"/>'


def _spread(shape: str, places: list[tuple[float, float]]) -> list[tuple[float, float]]:
    """Of lozenges, which lie along a curve, no more than there is room for; of all else, all."""
    if shape != "lozenge":
        return places
    kept = places[:1]
    for x, y in places[1:]:
        if x - kept[-1][0] >= MARKS_APART:
            kept.append((x, y))
    return kept


def unit_circle() -> tuple[FloatArray, FloatArray]:
    """Dense near the real axis, where poles crowd and one zooms in."""
    turn = np.concatenate(([0.0], np.geomspace(1e-5, 1.0, 400)))
    angle = np.pi * np.concatenate((turn / 2.0, 1.0 - turn[::-1] / 2.0))
    angle = np.concatenate((angle, -angle[::-1]))
    return np.cos(angle), np.sin(angle)


def _pixels(chart: Chart, x: FloatArray, y: FloatArray, box: Box) -> tuple[FloatArray, FloatArray]:
    with np.errstate(divide="ignore", invalid="ignore"):
        return place(chart.x, x, box.left, box.right), place(chart.y, y, box.bottom, box.top)


def _line_path(chart: Chart, x: FloatArray, y: FloatArray, box: Box) -> str:
    """What lies far outside the plot is held just outside it: no browser has to draw millions of pixels."""
    a, b = _pixels(chart, x, y, box)
    b = np.clip(np.where(np.isposinf(y), box.top - box.high, np.where(np.isneginf(y), box.bottom + box.high, b)),
                box.top - box.high, box.bottom + box.high)
    parts, pen = [], "M"
    for across, down in zip(a, b, strict=True):
        if isfinite(across) and isfinite(down) and -box.wide <= across <= 2 * box.wide:
            parts.append(f"{pen}{across:.1f} {down:.1f}")
            pen = "L"
        else:
            pen = "M"
    return "".join(parts)


def _edge(chart: Chart, edge: Edge, box: Box) -> str:
    """The limit's line, and a strip of hatching on its forbidden side."""
    if edge.axis == "y":
        y = float(np.clip(place(chart.y, edge.value, box.bottom, box.top), box.top, box.bottom))
        far = y - edge.side * STRIP
        area = f"M{box.left:g} {y:.1f}H{box.right:g}V{far:g}H{box.left:g}z"
        line = f"M{box.left:g} {y:.1f}H{box.right:g}"
    else:
        x = float(np.clip(place(chart.x, edge.value, box.left, box.right), box.left, box.right))
        far = x + edge.side * STRIP
        area = f"M{x:.1f} {box.top:g}V{box.bottom:g}H{far:g}V{box.top:g}z"
        line = f"M{x:.1f} {box.top:g}V{box.bottom:g}"
    return f'<path class="hatched" d="{area}"/><path class="edge" d="{line}"/>'


def _words(chart: Chart, box: Box) -> Iterator[str]:
    """Names at the curves' ends, and the word of each limit on its allowed side."""
    placed = []
    for item in chart.items:
        if isinstance(item, Line) and item.label:
            x, y = _pixels(chart, item.x, item.y, box)
            seen = np.isfinite(x) & np.isfinite(y) & (x <= box.right + 0.5) & (x >= box.left - 0.5)
            if seen.any():
                placed.append((float(np.clip(y[seen][-1], box.top + 6, box.bottom - 4)), item.role, item.label))
    for level, role, label in apart(placed, box.top + 6, box.bottom - 4):
        yield f'<text class="{role}" x="{box.right + 5:g}" y="{level + 4.5:.1f}">{escape(label)}</text>'
    for item in chart.items:
        if isinstance(item, Edge) and item.word and item.axis == "y":
            at = float(place(chart.y, item.value, box.bottom, box.top))
            if box.top <= at <= box.bottom:
                base = at + (14 if item.side > 0 else -5)
                yield f'<text class="limit" x="{box.left + 4:g}" y="{base:.1f}">{escape(item.word)}</text>'


def apart(labels: Sequence[tuple[float, str, str]], top: float, bottom: float) -> list[tuple[float, str, str]]:
    """Labels from top to bottom, pushed at least 16 px apart and back inside."""
    found: list[tuple[float, str, str]] = []
    for y, role, label in sorted(labels):
        least = found[-1][0] + LABEL_APART if found else top
        found.append((max(y, least), role, label))
    over = found[-1][0] - bottom if found else 0.0
    return [(y - max(0.0, over), role, label) for y, role, label in found]


def chart_data(chart: Chart, wide: float, high: float) -> dict[str, Any]:
    """What the script needs to draw it again at another zoom."""
    box = box_of(chart, wide, high)
    return {
        "box": [box.left, box.top, box.right, box.bottom, wide, high], "equal": chart.equal,
        "x": _axis_data(chart.x), "y": _axis_data(chart.y), "items": [_item_data(chart, item, wide) for item in chart.items],
    }


def _axis_data(axis: Axis) -> dict[str, Any]:
    least, most = axis.reach
    return {"low": axis.low, "high": axis.high, "least": least, "most": most, "log": axis.log, "unit": axis.unit,
            "rows": list(axis.rows)}


def _item_data(chart: Chart, item: Line | Points | Edge | Circle, wide: float) -> dict[str, Any]:
    if isinstance(item, Line):
        x, y = thinned(item.x, item.y, ZOOMED_POINTS * int(wide), log=chart.x.log)
        return {"kind": "line", "role": item.role, "label": item.label, "x": _numbers(x), "y": _numbers(y)}
    if isinstance(item, Points):
        return {"kind": "points", "shape": item.shape, "mark": SHAPES[item.shape], "x": _numbers(item.x),
                "y": _numbers(item.y)}
    if isinstance(item, Edge):
        return {"kind": "edge", "axis": item.axis, "value": item.value, "side": item.side, "word": item.word}
    x, y = unit_circle()
    return {"kind": "circle", "x": _numbers(x), "y": _numbers(y)}


def _numbers(values: FloatArray) -> list[float | None]:
    """With seven digits, which is more than a zoom shows; None for what is not finite."""
    return [float(f"{value:.7g}") if isfinite(value) else None for value in values.tolist()]
