"""Sections in series, as a diagram."""

from collections.abc import Sequence
from dataclasses import replace
from math import ceil

from streamhost.diagram import Builder, Diagram, Ref
from streamhost.diagram.hints import General
from streamhost.filters import Polynomials
from streamhost.structures.division import Division, Part, Parts
from streamhost.structures.form import Draft, Form, delays_down

MOST_COLUMNS = 11.75
"""Columns that fit the width of a page: up to these, two sections are drawn side by side."""

MOST_DRAWN = 8
"""Sections beyond which one that stands for all is drawn."""

FRONT = 0.75
"""Columns from the input to the gain in front, and from there to the first section."""

MOST_ROWS = 16
"""Rows that fit the height of a page; in a longer section one row stands for all between the first and the last."""

LEAD = 0.875
GAP = 1.0
WIDER = 0.75
"""Columns that a power of two takes before a section."""

GUTTER = 1.5


SHORT = ("0", "_k", "_N")
"""The numbers of the coefficients in a section whose row k stands for all between the first and the last."""

BUS = 0.375
ROOM = 0.25
"""Where several outputs are: the column of the wire that leads down to each of them, and the columns that it takes."""


def draw(parts: Parts, form: Form) -> Diagram:
    """Each section in the form, a register between two; the common sections above, those to each output below them.

    Sections share no delays, and neither do outputs. A gain in front is drawn before the first section and belongs to it.
    """
    builder = Builder()
    signal = builder.place(builder.input(), (0.0, 0.0))
    tiles = tiles_of(builder, parts, form)
    draw_all(builder, tiles, signal)
    return builder.build(general=general_of(parts, form))


def draw_all(builder: Builder, tiles: "Sequence[Tiles]", signal: Ref) -> None:
    """What is common, a register behind it, and from there, or else from the input, what leads to each output."""
    if len(tiles) == 1:
        tiles[0].place_output(builder.output(tiles[0].draw(signal)))
        return
    common, branches = ([], tiles) if tiles[0].part.name else (tiles[:1], tiles[1:])
    builder.trunk(signal, *([(BUS, 0.0)] if not common else []))
    for line in common:
        signal = line.fork(line.draw(signal), branches[0].top)
    ends = []
    for above, line in zip([branches[0], *branches], branches, strict=False):
        lead_down(builder, signal, above.top, line)
        ends.append(line.draw(signal))
    for line, end in zip(branches, ends, strict=True):
        line.place_output(builder.output(end, line.part.name))


def lead_down(builder: Builder, signal: Ref, above: float, line: "Tiles") -> None:
    """The wire of a signal goes on down the bus, from wherever the output above has led it, and up to a line of sections."""
    column, _ = builder.trunk_end(signal)
    if column != BUS:
        builder.trunk(signal, (column, above), (BUS, above))
    builder.trunk(signal, (BUS, line.top), (line.begin - 0.5, line.top))


def tiles_of(builder: Builder, parts: Parts, form: Form) -> "list[Tiles]":
    """A place on the page for each part, one below the other."""
    left = 2 * FRONT if any(begins_with_symbol(part.division) for part in parts) else LEAD
    found: list[Tiles] = []
    top, first = 0.0, 0
    for part in parts:
        found.append(Tiles(builder, part, form, left + (ROOM if len(parts) > 1 else 0.0), top, first))
        top, first = found[-1].bottom, first + len(part.division.sections)
    return found


def begins_with_symbol(division: Division) -> bool:
    """Whether something stands before the first section: a gain in front or a power of two."""
    return division.front is not None or any(division.shifts[:1])


class Tiles:
    """The sections of a part: drawn side by side, row under row, from a column and a row on.

    `first`: the number of the part's first section among all. `numbers`, if there are some, are those of `SHORT`.
    """

    numbers: tuple[str, ...] = ()

    def __init__(self, builder: Builder, part: Part, form: Form, left: float, top: float, first: int) -> None:
        self.builder, self.part, self.form, self.left, self.top, self.first = builder, part, form, left, top, first
        self.sizes = [form.size_of(section) for section in part.division.sections]
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
                          division.ratio(index))
            signal = self.form.build_section(draft, signal)
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
        if below > row:
            gutter, out, back = below - LEAD, column + self.gap - 0.125, left - 0.5
            self.builder.trunk(between, (out, row), (out, gutter), (back, gutter), (back, below))
        return between

    def fork(self, signal: Ref, below: float) -> Ref:
        """The register behind the last section, and the wire from it to the bus and to the row where that begins."""
        between = self.mark(signal, len(self.sizes))
        column, row = self.right(len(self.sizes) - 1)
        gutter, out = below - LEAD, column + self.gap - 0.125
        self.builder.trunk(between, (out, row), (out, gutter), (BUS, gutter), (BUS, below))
        return between

    def mark(self, signal: Ref, index: int) -> Ref:
        column, row = self.right(index - 1)
        between = self.builder.round(signal, f"between{self.ending}_{index}")
        return self.builder.place(between, (column + self.gap - GAP / 2, row), small=True)

    def place_output(self, output: Ref) -> None:
        column, row = self.right(len(self.sizes) - 1)
        self.builder.place(output, (column + LEAD + (WIDER if any(self.part.division.shifts[-1:]) else 0.0), row))


def general_of(parts: Parts, form: Form) -> General | None:
    """What is drawn where there are too many sections, or one is too long."""
    sections = [section for part in parts for section in part.division.sections]
    deepest = max(map(delays_down, sections)) * form.pitch if form.size is None else 0.0
    too_high = len(parts) > 1 and rows_of(parts, form) > MOST_ROWS
    if len(sections) <= MOST_DRAWN and (deepest > MOST_ROWS or (too_high and len(sections) == len(parts))):
        return general_row(parts, form)
    return general_section(parts, form) if too_high or len(sections) > MOST_DRAWN else None


def rows_of(parts: Parts, form: Form) -> float:
    """How many rows the drawing takes."""
    return tiles_of(Builder(), parts, form)[-1].bottom - GUTTER


def general_section(parts: Parts, form: Form) -> General:
    """One section with the index i."""
    builder = Builder()
    sections = [section for part in parts for section in part.division.sections]
    fullest = max(sections, key=lambda section: len(section.a) + len(section.b))
    x = builder.place(builder.input("x_i"), (0.0, 0.0))
    y = form.build_section(Draft(builder, fullest, 0, "_i", (LEAD, 0.0)), x)
    size = form.size_of(fullest)
    builder.place(builder.output(y, "y_i"), (LEAD + size.columns + LEAD, size.exit))
    return General(builder.build(), caption_of(parts))


def caption_of(parts: Parts) -> str:
    counts = [(part.name, len(part.division.sections)) for part in parts]
    if len(parts) == 1:
        count = counts[0][1]
        return (f"Section i of {count} in series, each rounded before the next: "
                f"x_1 = x, x_i+1 = y_i, y = y_{count}.")
    lines = ", ".join(f"{count} to {name}" if name else f"{count} for all outputs" for name, count in counts)
    return f"Section i in place of all, each rounded before the next, x_i+1 = y_i: {lines}."


def general_row(parts: Parts, form: Form) -> General:
    """All that is drawn, with a row k in each long section that stands for all between the first and the last."""
    builder = Builder()
    short = tuple(Part(part.name, shortened(part.division)) for part in parts)
    signal = builder.place(builder.input(), (0.0, 0.0))
    tiles = tiles_of(builder, short, form)
    for line, part in zip(tiles, parts, strict=True):
        line.numbers = SHORT if is_long(part.division) else ()
    draw_all(builder, tiles, signal)
    lasts = {part.name: max(map(delays_down, part.division.sections)) for part in parts if is_long(part.division)}
    if len(set(lasts.values())) == 1:
        last = max(lasts.values())
        said = f"The row of k stands for all rows k = 1 to {last - 1}, one delay apart; N = {last}."
    else:
        each = ", ".join(f"{last} to {name}" for name, last in lasts.items())
        said = f"The row of k stands for all rows k = 1 to N - 1, one delay apart; N = {each}."
    return General(builder.build(), said)


def is_long(division: Division) -> bool:
    return any(delays_down(section) > len(SHORT) - 1 for section in division.sections)


def shortened(division: Division) -> Division:
    """Without the gain in front, and without what the general row stands for."""
    sections = tuple(Polynomials(section.b[:3], section.a[:3]) for section in division.sections)
    return replace(division, sections=sections, front=None, undivided=None, shifts=())
