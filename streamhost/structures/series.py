"""Sections in series or in parallel, as a diagram."""

from collections.abc import Sequence
from dataclasses import replace

from streamhost.diagram import Builder, Diagram, Ref
from streamhost.diagram.hints import General
from streamhost.diagram.tapped import LEAD
from streamhost.filters import Polynomials
from streamhost.structures.branches import Branches
from streamhost.structures.division import Division, Part, Parts
from streamhost.structures.form import Draft, Form, can_lie, delays_down
from streamhost.structures.tiles import BUS, FRONT, GUTTER, ROOM, Tiles, begins_with_symbol

MOST_DRAWN = 8
"""Sections beyond which one that stands for all is drawn."""

MOST_ROWS = 16.25
"""Rows that fit the height of a page; in a longer section one row stands for all between the first and the last."""

FEWEST_ROWS = 8
"""Rows from which a section is offered like that, for where marks and a table need the height."""

SHORT = ("0", "_k", "_N")
"""The numbers of the coefficients in a section whose row k stands for all between the first and the last."""


def draw(parts: Parts, form: Form) -> Diagram:
    """Each section in the form, a register between two; the common sections above, those to each output below them.

    Sections share no delays, and neither do outputs. A gain in front is drawn before the first section and belongs to it.
    """
    builder = Builder(form.origin)
    signal = builder.place(builder.input(), (0.0, 0.0))
    tiles = tiles_of(builder, parts, form)
    draw_all(builder, tiles, signal)
    return builder.build(general=general_of(parts, form))


def draw_all(builder: Builder, tiles: "Sequence[Tiles]", signal: Ref) -> None:
    """What is common, a register behind it, and from there, or else from the input, what leads to each output."""
    if len(tiles) == 1:
        end = tiles[0].draw(signal)
        tiles[0].place_output(builder.output(end), end)
        for name, offer in tiles[0].offered.items():
            output = builder.output(offer.ref, name)
            if offer.at is not None:
                builder.place(output, offer.at)
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
        line.place_output(builder.output(end, line.part.name), end)


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
        kind = Tiles if part.division.direct is None else Branches
        found.append(kind(builder, part, form, left + (ROOM if len(parts) > 1 else 0.0), top, first))
        found[-1].alone = len(parts) == 1 and part.division.direct is None
        top, first = found[-1].bottom, first + len(part.division.sections) + (part.division.direct is not None)
    return found


def general_of(parts: Parts, form: Form) -> General | None:
    """What is drawn where there are too many sections, or one is too long."""
    sections = [section for part in parts for section in part.division.sections]
    longest = max(sections, key=delays_down)
    if (general := form.general(longest)) is not None:
        return general if len(sections) == 1 else replace(general, caption=f"{caption_of(parts)} {general.caption}")
    deepest = delays_down(longest) * form.pitch if not form.has_size else 0.0
    if len(sections) == len(parts) == 1 and not parts[0].division.shifts and can_lie(sections[0]):
        deepest = 0.0
    branched = any(part.division.direct is not None for part in parts)
    too_high = (branched or len(sections) > 1) and rows_of(parts, form) > MOST_ROWS
    one_each = not form.has_size and len(sections) == len(parts)
    if len(sections) <= MOST_DRAWN and (deepest > MOST_ROWS or (too_high and one_each)):
        return general_row(parts, form)
    if len(sections) == 1 and not form.origin and deepest >= FEWEST_ROWS:
        return replace(general_row(parts, form), always=False)
    return general_section(parts, form) if too_high or len(sections) > MOST_DRAWN else None


def rows_of(parts: Parts, form: Form) -> float:
    """How many rows the drawing takes."""
    return tiles_of(Builder(), parts, form)[-1].bottom - GUTTER


def general_section(parts: Parts, form: Form) -> General:
    """One section with the index i."""
    builder = Builder(form.origin)
    sections = [section for part in parts for section in part.division.sections]
    fullest = max(sections, key=lambda section: len(section.a) + len(section.b))
    x = builder.place(builder.input("x_i"), (0.0, 0.0))
    y = form.build_section(Draft(builder, fullest, 0, "_i", (LEAD, 0.0)), x)
    size = form.size_of(fullest)
    builder.place(builder.output(y, "y_i"), (LEAD + size.columns + LEAD, size.exit))
    return General(builder.build(), caption_of(parts))


def caption_of(parts: Parts) -> str:
    counts = [(part.name, len(part.division.sections)) for part in parts]
    if len(parts) == 1 and parts[0].division.direct is not None:
        beside = " and of what stands beside them, c(n) x" if any(parts[0].division.direct) else ""
        return f"Section i of {counts[0][1]} in parallel, x_i = x; y is the sum of all y_i{beside}."
    if len(parts) == 1:
        count = counts[0][1]
        return (f"Section i of {count} in series, each rounded before the next: "
                f"x_1 = x, x_i+1 = y_i, y = y_{count}.")
    lines = ", ".join(f"{count} to {name}" if name else f"{count} for all outputs" for name, count in counts)
    return f"Section i in place of all, each rounded before the next, x_i+1 = y_i: {lines}."


def general_row(parts: Parts, form: Form) -> General:
    """All that is drawn, with a row k in each long section that stands for all between the first and the last."""
    builder = Builder(form.origin)
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
