"""A chart before it is drawn: axes and what lies between them, in the units of the axes."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from math import ceil, floor, log10

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

@dataclass(frozen=True)
class Axis:
    """low, high: what is shown at first; least, most: how far one can zoom out. rows: names, of an axis that has no scale."""

    low: float
    high: float
    unit: str = ""
    log: bool = False
    least: float | None = None
    most: float | None = None
    rows: tuple[str, ...] = ()

    @property
    def reach(self) -> tuple[float, float]:
        return (self.low if self.least is None else min(self.low, self.least),
                self.high if self.most is None else max(self.high, self.most))


@dataclass(frozen=True, eq=False)
class Line:
    """A curve; gaps are NaN. role: "heard", "before", "difference" or "ghost"; label: what stands at its end."""

    role: str
    x: FloatArray
    y: FloatArray
    label: str = ""


@dataclass(frozen=True, eq=False)
class Points:
    """Symbols. shape: "lozenge", "pole", "zero", "pole-before", "zero-before", "tick-l1", "tick-sine" or "tick-noise"."""

    shape: str
    x: FloatArray
    y: FloatArray


@dataclass(frozen=True)
class Edge:
    """A limit across the whole chart, hatched on the forbidden side. axis: "x" or "y"; side: 1 above it, -1 below."""

    axis: str
    value: float
    side: int
    word: str = ""


@dataclass(frozen=True)
class Circle:
    """The unit circle."""


@dataclass(frozen=True)
class Chart:
    """said: the whole chart in a sentence, for who does not see it. equal: one scale for both axes. left: the least room for
    the texts of the vertical axis, in px, so that several charts have one."""

    said: str
    x: Axis
    y: Axis
    items: tuple[Line | Points | Edge | Circle, ...]
    equal: bool = False
    left: float = 24.0


def thinned(x: FloatArray, y: FloatArray, most: int, *, log: bool = False) -> tuple[FloatArray, FloatArray]:
    """The least and the greatest of each of `most` / 2 stretches of the axis, in their order, so that no peak is lost.

    x rises; what a logarithmic axis cannot have is left out.
    """
    if log:
        x, y = x[x > 0.0], y[x > 0.0]
    if len(x) <= most:
        return x, y
    along = np.log(x) if log else x
    ends = np.searchsorted(along, np.linspace(along[0], along[-1], most // 2 + 1)[1:-1])
    edges = np.unique(np.concatenate(([0], ends, [len(x)])))
    keep: list[int] = []
    for first, last in pairwise(edges):
        part = y[first:last]
        if np.isnan(part).all():
            keep.append(int(first))
        else:
            keep += sorted({int(first + np.nanargmin(part)), int(first + np.nanargmax(part))})
    return x[keep], y[keep]


def nice_step(span: float, most: float) -> float:
    """The least of 1, 2 and 5 times a power of ten that is at least span / most."""
    least = span / max(most, 1.0)
    power = 10.0 ** floor(log10(least))
    return next(step * power for step in (1.0, 2.0, 5.0, 10.0) if step * power >= least * (1.0 - 1e-9))


def ticks(axis: Axis, pixels: float, room: float, *, unit: bool = True) -> list[tuple[float, str]]:
    """Places and texts of the ticks of an axis so long, at least `room` px apart; the last carries the unit if it is to."""
    low, high, name = axis.low, axis.high, axis.unit if unit else ""
    if axis.log and high / low >= 10.0:
        places = _log_places(low, high, pixels / log10(high / low), room)
        return _texts(places, name, None)
    step = nice_step(high - low, pixels / room)
    first, last = ceil(low / step - 1e-9), floor(high / step + 1e-9)
    return _texts([each * step for each in range(first, last + 1)], name, max(0, -floor(log10(step) + 1e-9)))


def _log_places(low: float, high: float, decade: float, room: float) -> list[float]:
    """Powers of ten, with 2 and 5 where a decade has room for them, else every second or third power."""
    powers = range(floor(log10(low)), ceil(log10(high)) + 1)
    if decade * 0.3 >= room:
        places = [multiple * 10.0**power for power in powers for multiple in (1.0, 2.0, 5.0)]
    else:
        every = max(1, ceil(room / decade))
        places = [10.0**power for power in powers if power % every == 0]
    return [each for each in places if low * (1 - 1e-9) <= each <= high * (1 + 1e-9)]


def _texts(places: Sequence[float], unit: str, decimals: int | None) -> list[tuple[float, str]]:
    """In thousands of hertz where that is shorter; the last with the unit behind it. decimals: None, as many as it has."""
    found = []
    for index, each in enumerate(places):
        thousands = unit == "Hz" and abs(each) >= 1000.0
        if thousands:
            shown = f"{each / 1000.0:.{(decimals or 0) + 3}f}".rstrip("0").rstrip(".")
        else:
            shown = f"{each:g}" if decimals is None else f"{each:.{decimals}f}"
        text = shown.replace("-", "\N{MINUS SIGN}") if float(shown) else shown.removeprefix("-")
        last = unit if index == len(places) - 1 else ""
        found.append((each, text + (" k" if thousands else " " if last else "") + last))
    return found
