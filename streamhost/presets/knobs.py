"""The parameters of a preset that can be turned while it runs: where they stand, their neighbours, the preset at others.

Turned are those that the file states and that move coefficients under one diagram: frequencies by ratios, gains by
differences, quality, bandwidth and slope by ratios. Orders, lengths, windows and ripples make another filter.
"""

import copy
from collections.abc import Iterable
from dataclasses import dataclass, replace

from streamhost.filters.designs import KINDS
from streamhost.filters.parameters import Choice, Range
from streamhost.presets.positions import DECIBELS, RATIOS
from streamhost.presets.preset import Preset
from streamhost.presets.reading import read_preset

Position = float | tuple[float, ...]

DIGITS = 12
"""Of a position, so that three thirds are an octave."""


@dataclass(frozen=True)
class Knob:
    """A parameter of a [[filter]], numbered from 0, where it stands now, and the positions that the preset gives it."""

    key: str
    filter: int
    name: str
    unit: str
    at: Position
    range: Range
    positions: tuple[Position, ...] = ()

    def turned(self, steps: float) -> Position:
        """So many steps away; a parameter that is one of some numbers goes on to the next of them, and at its end stays."""
        if isinstance(self.range, Choice) and isinstance(self.at, int | float):
            numbers = sorted(self.range.numbers)
            place = numbers.index(self.at)
            return numbers[min(max(place + round(steps), 0), len(numbers) - 1)]
        if self.name in DECIBELS:
            assert isinstance(self.at, int | float), "a gain is one number"
            return _rounded(self.at + steps * DECIBELS[self.name])
        return self.times(RATIOS[self.name] ** steps)

    def times(self, ratio: float) -> Position:
        """Its number, or all of them, by a ratio."""
        return tuple(_rounded(each * ratio) for each in self.at) if isinstance(self.at, tuple) else _rounded(self.at * ratio)

    def between(self, other: Position, share: float) -> Position:
        """So far on the way to another position, 0 to 1: gains along a line, all else along equal ratios."""
        if isinstance(self.at, tuple) and isinstance(other, tuple):
            return tuple(a * (b / a) ** share for a, b in zip(self.at, other, strict=True))
        assert isinstance(self.at, int | float) and isinstance(other, int | float), "positions are of one shape"
        return self.at + share * (other - self.at) if self.name in DECIBELS else self.at * (other / self.at) ** share

    def said(self, position: Position) -> str:
        """A position with the unit, for instance "110 Hz"."""
        numbers = position if isinstance(position, tuple) else (position,)
        said = ", ".join(f"{each:.4g}" for each in numbers).replace("-", "\N{MINUS SIGN}")
        return f"{said} {self.unit}" if self.unit else said


def knobs(preset: Preset) -> tuple[Knob, ...]:
    """What can be turned, in the order of the file. `key` is spelt as --vary spells it."""
    tables = preset.source.table["filter"]
    found = []
    for index, table in enumerate(tables):
        kind = KINDS.get(table.get("kind", ""))
        for parameter in kind.parameters if kind is not None else ():
            if parameter.name in table and (parameter.name in RATIOS or parameter.name in DECIBELS):
                key = f"filter.{index + 1}.{parameter.name}" if len(tables) > 1 else f"filter.{parameter.name}"
                stated = table.get("positions", {}).get(parameter.name, ())
                found.append(Knob(key, index, parameter.name, parameter.unit, _position(table[parameter.name]),
                                  parameter.range, tuple(_position(each) for each in stated)))
    return tuple(found)


def turned(preset: Preset, positions: Iterable[tuple[Knob, Position]]) -> Preset:
    """The preset with these knobs at these positions and nothing else changed. PresetError where it cannot be."""
    table = copy.deepcopy(dict(preset.source.table))
    for knob, position in positions:
        table["filter"][knob.filter][knob.name] = list(position) if isinstance(position, tuple) else position
    return read_preset(replace(preset.source, table=table), preset.path).at(preset.rate)


def _position(value: float | list[float]) -> Position:
    return tuple(float(each) for each in value) if isinstance(value, list) else float(value)


def _rounded(number: float) -> float:
    return float(f"{number:.{DIGITS}g}")
