"""Which positions of the knobs are tabled, and which of them are neighbours."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import product
from math import prod

from streamhost.errors import RequestError
from streamhost.presets import Preset
from streamhost.presets.knobs import Knob, Position, knobs
from streamhost.presets.positions import DECIBELS

MOST_STATED = 2000

FINENESS = ((1, 1.0, True), (1, 2.0, True), (1, 3.0, True), (3, 3.0, True), (3, 6.0, True), (3, 6.0, False))
"""Steps in third octaves and in dB, and whether the knobs of a filter are turned with each other; the finest first, as coarse
as it takes to stay within the number that is allowed."""

Axes = tuple[tuple[Knob, tuple[Position, ...]], ...]
Point = tuple[Position, ...]
"""A position of each knob of the preset."""


@dataclass(frozen=True, eq=False)
class Grid:
    """`points` in order, without repetition; `pairs` of them, by index, that are one step of one knob apart, up and down."""

    knobs: tuple[Knob, ...]
    points: tuple[Point, ...]
    pairs: tuple[tuple[int, int], ...]
    steps: str

    def said(self, point: Point, beside: Knob | None = None) -> str:
        """Where those knobs stand that the preset has elsewhere, but for one; all of them where none does."""
        moved = [(knob, at) for knob, at in zip(self.knobs, point, strict=True) if knob is not beside and at != knob.at]
        everything = [] if beside is not None else list(zip(self.knobs, point, strict=True))
        return ", ".join(f"{knob.key} {knob.said(at)}" for knob, at in moved or everything)

    def turn(self, first: int, second: int) -> tuple[str, str]:
        """What changes between two points, and where the other knobs stand."""
        both = zip(self.knobs, self.points[first], self.points[second], strict=True)
        knob, here, there = next((knob, here, there) for knob, here, there in both if here != there)
        return f"{knob.key} {knob.said(here)} to {knob.said(there)}", self.said(self.points[first], knob)


def grid_of(preset: Preset, most: int) -> Grid:
    """Every stated position with every other; a preset that states none gets steps about where its knobs stand.

    Then the knobs of each [[filter]] are turned with each other, those of the others stay, and the steps are as fine as
    `most` points allow; where even that is too many, each knob alone. RequestError where more than 2000 are stated.
    """
    found = knobs(preset)
    if any(knob.positions for knob in found):
        axes = tuple((knob, knob.positions) for knob in found if knob.positions)
        if (count := prod(len(positions) for _, positions in axes)) > MOST_STATED:
            raise RequestError(f"{preset.source.name}: its positions make {count} settings; at most {MOST_STATED} are tried.")
        return _gathered(found, [axes], "as the preset states them")
    for thirds, decibels, together in FINENESS:
        groups = [_around(group, thirds, decibels) for group in _by_filter(found)]
        if not together:
            groups = [(axis,) for axes in groups for axis in axes]
        if sum(prod(len(positions) for _, positions in axes) for axes in groups) <= most:
            break
    return _gathered(found, groups, _said(found, thirds, decibels, together))


def _by_filter(found: Sequence[Knob]) -> list[list[Knob]]:
    return [[knob for knob in found if knob.filter == index] for index in dict.fromkeys(knob.filter for knob in found)]


def _around(group: Sequence[Knob], thirds: int, decibels: float) -> Axes:
    """Frequencies to an octave to either side, gains to 6 dB; without a gain, quality, bandwidth or slope to an octave."""
    has_gain = any(knob.name in DECIBELS for knob in group)
    axes: list[tuple[Knob, tuple[Position, ...]]] = []
    for knob in group:
        if knob.name in DECIBELS:
            count = round(6.0 / decibels)
            axes.append((knob, tuple(knob.turned(k * decibels / DECIBELS[knob.name]) for k in range(-count, count + 1))))
        elif knob.name.endswith("frequency"):
            axes.append((knob, tuple(dict.fromkeys(knob.turned(k * thirds) for k in range(-3 // thirds, 3 // thirds + 1)))))
        elif not has_gain:
            axes.append((knob, tuple(knob.turned(k) for k in (-2, -1, 0, 1, 2))))
    return tuple(axes)


def _said(found: Sequence[Knob], thirds: int, decibels: float, together: bool) -> str:
    said = []
    if any(knob.name.endswith("frequency") for knob in found):
        said.append(f"frequencies by {'thirds of an octave' if thirds == 1 else 'octaves'} to an octave to either side")
    if any(knob.name in DECIBELS for knob in found):
        said.append(f"gains by {decibels:g} dB to 6 dB to either side")
    if any(not knob.name.endswith("frequency") and knob.name not in DECIBELS for knob in found):
        said.append("where a filter has no gain, q, bandwidth and slope by half octaves to an octave to either side")
    if len(found) > 1:
        said.append("those of one filter with each other" if together else "each alone")
    return "; ".join(said)


def _gathered(found: tuple[Knob, ...], groups: Sequence[Axes], steps: str) -> Grid:
    """The points of all groups, each once, and their neighbours."""
    places: dict[Point, int] = {}
    pairs: dict[tuple[int, int], None] = {}
    for axes in groups:
        for place in product(*(range(len(positions)) for _, positions in axes)):
            here = places.setdefault(_point(found, axes, place), len(places))
            for lower in _lower(place):
                there = places[_point(found, axes, lower)]
                if here != there:
                    pairs |= {(there, here): None, (here, there): None}
    return Grid(found, tuple(places), tuple(pairs), steps)


def _lower(place: tuple[int, ...]) -> Iterator[tuple[int, ...]]:
    for axis, index in enumerate(place):
        if index > 0:
            yield (*place[:axis], index - 1, *place[axis + 1 :])


def _point(found: Sequence[Knob], axes: Axes, place: Sequence[int]) -> Point:
    turned = {knob.key: positions[index] for (knob, positions), index in zip(axes, place, strict=True)}
    return tuple(turned.get(knob.key, knob.at) for knob in found)
