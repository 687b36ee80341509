"""Sections in series, as a diagram."""

from collections.abc import Sequence

from streamhost.diagram import Builder, Diagram, Ref
from streamhost.diagram.hints import General
from streamhost.filters import Polynomials
from streamhost.structures.division import Division, Sections
from streamhost.structures.form import Draft, Form, Size, delays_down

A_ROW = 2
"""Sections drawn side by side: two fit the width of a page in every form."""

MOST_DRAWN = 8
"""Sections beyond which one that stands for all is drawn."""

FRONT = 0.75
"""Columns from the input to the gain in front, and from there to the first section."""

MOST_ROWS = 16
"""Rows that fit the height of a page; in a longer section one row stands for all between the first and the last."""

LEAD = 0.875
GAP = 1.0
GUTTER = 1.5


def draw(division: Division, form: Form) -> Diagram:
    """Each section in the form, a register between two, the last section's output to the output.

    Sections share no delays. The gain in front is drawn before the first section and belongs to it.
    """
    builder = Builder()
    signal = builder.place(builder.input(), (0.0, 0.0))
    left = LEAD
    if division.front is not None:
        signal = builder.place(builder.gain(signal, "g", division.front, section=0, part="b"), (FRONT, 0.0))
        left = 2 * FRONT
    several = len(division.sections) > 1
    tiles = Tiles(builder, [form.size_of(section) for section in division.sections], left)
    for index, section in enumerate(division.sections):
        if index > 0:
            signal = tiles.register(signal, index)
        suffix = f"_{index + 1}" if several else ""
        draft = Draft(builder, section, index, suffix, tiles.origin(index), exact=division.ratio(index))
        signal = form.build_section(draft, signal)
    tiles.place_output(builder.output(signal), len(division.sections) - 1)
    return builder.build(general=general_of(division.sections, form))


class Tiles:
    """Where the sections of a series are drawn: side by side, row under row."""

    def __init__(self, builder: Builder, sizes: Sequence[Size], left: float) -> None:
        self.builder, self.sizes, self.left = builder, sizes, left
        self.width = max(size.columns for size in sizes)
        self.height = max(size.rows for size in sizes) + GUTTER

    def origin(self, index: int) -> tuple[float, float]:
        """The first column and row of a section."""
        return self.left + index % A_ROW * (self.width + GAP), index // A_ROW * self.height

    def right(self, index: int) -> tuple[float, float]:
        """Where the signal leaves a section."""
        column, row = self.origin(index)
        return column + self.sizes[index].columns, row + self.sizes[index].exit

    def register(self, signal: Ref, index: int) -> Ref:
        """The register before a section, at the end of the section before it; the wire to a new row runs in the gutter."""
        column, row = self.right(index - 1)
        between = self.builder.place(self.builder.round(signal, f"between_{index}"), (column + GAP / 2, row), small=True)
        left, below = self.origin(index)
        if below > row:
            gutter, out, back = below - LEAD, column + 0.875, left - 0.5
            self.builder.trunk(between, (out, row), (out, gutter), (back, gutter), (back, below))
        return between

    def place_output(self, output: Ref, last: int) -> None:
        column, row = self.right(last)
        self.builder.place(output, (column + LEAD, row))


def general_of(sections: Sections, form: Form) -> General | None:
    """What is drawn where there are too many sections, or one is too long."""
    if len(sections) > MOST_DRAWN:
        return general_section(sections, form)
    longest = max(map(delays_down, sections))
    return general_row(sections[0], form) if form.size is None and longest * form.pitch > MOST_ROWS else None


def general_section(sections: Sections, form: Form) -> General:
    """One section with the index i."""
    builder = Builder()
    fullest = max(sections, key=lambda section: len(section.a) + len(section.b))
    x = builder.place(builder.input("x_i"), (0.0, 0.0))
    y = form.build_section(Draft(builder, fullest, 0, "_i", (LEAD, 0.0)), x)
    size = form.size_of(fullest)
    builder.place(builder.output(y, "y_i"), (LEAD + size.columns + LEAD, size.exit))
    return General(builder.build(), f"Section i of {len(sections)} in series, each rounded before the next: "
                                    f"x_1 = x, x_i+1 = y_i, y = y_{len(sections)}.")


def general_row(section: Polynomials, form: Form) -> General:
    """One section with a row k that stands for all between the first and the last."""
    builder = Builder()
    last = delays_down(section)
    short = Polynomials(section.b[:3], section.a[:3])
    x = builder.place(builder.input(), (0.0, 0.0))
    y = form.build_section(Draft(builder, short, 0, "", (LEAD, 0.0), ("0", "_k", "_N")), x)
    builder.place(builder.output(y), (LEAD + form.width + LEAD, 0.0))
    return General(builder.build(), f"The row of k stands for all rows k = 1 to {last - 1}, one delay apart; N = {last}.")
