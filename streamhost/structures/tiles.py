"""The sections of one part of a filter on the page."""

from collections.abc import Mapping
from math import ceil
from types import MappingProxyType

from streamhost.diagram import Builder, Ref
from streamhost.diagram.tapped import LEAD, ahead
from streamhost.structures.division import Division, Part
from streamhost.structures.form import Draft, Form, Offer

MOST_COLUMNS = 12.0
"""Columns that fit the width of a page: up to these, two sections are drawn side by side."""

FRONT = 0.75
"""Columns from the input to the gain in front, and from there to the first section."""

GAP = 1.0
WIDER = 0.75
"""Columns that a power of two takes before a section."""

GUTTER = 1.5

BUS = 0.375
ROOM = 0.25
"""Where several outputs are: the column of the wire that leads down to each of them, and the columns that it takes."""


def begins_with_symbol(division: Division) -> bool:
    """Whether something stands before the first section: a gain in front or a power of two."""
    return division.front is not None or any(division.shifts[:1])


class Tiles:
    """The sections of a part: drawn side by side, row under row, from a column and a row on.

    `first`: the number of the part's first section among all. `numbers`, if there are some, are those of `SHORT`.
    `alone`: there is no other part. `offered`: further outputs of the form, once drawn, where they are asked for.
    """

    numbers: tuple[str, ...] = ()
    alone = False
    offered: Mapping[str, Offer] = MappingProxyType({})

    def __init__(self, builder: Builder, part: Part, form: Form, left: float, top: float, first: int) -> None:
        self.builder, self.part, self.form, self.left, self.top, self.first = builder, part, form, left, top, first
        self.sizes = [form.size_of(section, part.division.ratio(i)) for i, section in enumerate(part.division.sections)]
        self.width = max(size.columns for size in self.sizes)
        self.height = max(size.rows for size in self.sizes) + GUTTER
        self.gap = GAP + (WIDER if part.division.shifts else 0.0)
        self.a_row = 2 if left + 2 * self.width + self.gap + LEAD <= MOST_COLUMNS else 1
        self.ending = f"_{part.name}" if part.name else ""

    @property
    def begin(self) -> float:
        """The column of the first symbol."""
        return self.left - (FRONT if begins_with_symbol(self.part.division) else 0.0)

    @property
    def bottom(self) -> float:
        """The row at which the next part begins."""
        return self.top + ceil(len(self.sizes) / self.a_row) * self.height

    def draw(self, signal: Ref) -> Ref:
        """The sections behind a signal; what comes out of the last."""
        division = self.part.division
        if division.front is not None:
            gain = self.builder.gain(signal, f"g{self.ending}", division.front, section=self.first, part="b")
            signal = self.builder.place(gain, (self.begin, self.top))
        for index, section in enumerate(division.sections):
            signal = self.scaled(signal, index)
            if index > 0:
                signal = self.register(signal, index)
            suffix = f"{self.ending}_{index + 1}" if len(division.sections) > 1 else self.ending
            draft = Draft(self.builder, section, self.first + index, suffix, self.origin(index), self.numbers,
                          division.ratio(index), self.alone and len(division.sections) == 1 and not division.shifts,
                          division.all_outputs)
            signal = self.form.build_section(draft, signal)
            if division.all_outputs:
                self.offered = draft.offered
        return self.scaled(signal, len(division.sections))

    def scaled(self, signal: Ref, index: int) -> Ref:
        """The power of two before a section, at the end of the section before it, or behind the last."""
        shifts = self.part.division.shifts
        if not shifts or shifts[index] == 0:
            return signal
        shift = self.builder.shift(signal, shifts[index], f"scale{self.ending}_{index + 1}")
        column, row = self.right(index - 1) if index else (self.begin - WIDER, self.top)
        return self.builder.place(shift, (column + WIDER, row))

    def origin(self, index: int) -> tuple[float, float]:
        """The first column and row of a section."""
        return self.left + index % self.a_row * (self.width + self.gap), self.top + index // self.a_row * self.height

    def right(self, index: int) -> tuple[float, float]:
        """Where the signal leaves a section."""
        column, row = self.origin(index)
        return column + self.sizes[index].columns, row + self.sizes[index].exit

    def register(self, signal: Ref, index: int) -> Ref:
        """The register before a section, at the end of the section before it; the wire to a new row runs in the gutter."""
        between = self.mark(signal, index)
        column, row = self.right(index - 1)
        left, below = self.origin(index)
        out = column + self.gap - 0.125
        if below < row:
            self.builder.trunk(between, (out, row), (out, below))
        if below > row:
            gutter, back = below - LEAD, left - 0.5
            self.builder.trunk(between, (out, row), (out, gutter), (back, gutter), (back, below))
        return between

    def fork(self, signal: Ref, below: float) -> Ref:
        """The register behind the last section, and the wire from it to the bus and to the row where that begins."""
        between = self.mark(signal, len(self.sizes))
        column, row = self.right(len(self.sizes) - 1)
        gutter, out = below - LEAD, column + self.gap - 0.125
        self.builder.trunk(between, (out, row), (out, gutter), (BUS, gutter), (BUS, below))
        return between

    @property
    def is_compact(self) -> bool:
        """Whether the last section has nothing to the right of where its signal leaves: the forms have feedback there."""
        division = self.part.division
        own_shape = self.form.has_size or self.form.origin
        return not own_shape and not division.shifts and len(division.sections[-1].a) == 1

    def mark(self, signal: Ref, index: int) -> Ref:
        column, row = self.right(index - 1)
        between = self.builder.round(signal, f"between{self.ending}_{index}")
        return self.builder.place(between, (column + self.gap - GAP / 2, row), small=True)

    def place_output(self, output: Ref, signal: Ref) -> None:
        """Where the last section ends, or, of one that is alone and without recursion, right behind its last node."""
        column, row = self.right(len(self.sizes) - 1)
        place = self.builder.place_of(signal)
        if place is not None and self.alone and self.is_compact:
            self.builder.place(output, ahead(place), place.face)
            return
        self.builder.place(output, (column + LEAD + (WIDER if any(self.part.division.shifts[-1:]) else 0.0), row))
