"""A figure as plain text: for a terminal, and for a comment in source code.

    x[n] --*--[b0>-->(+)--> y[n]      (+) adds, a - beside an arrow head subtracts; [b0> multiplies; * branches; + turns.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field

from streamhost.drawing.figure import Figure
from streamhost.drawing.layout import Layout
from streamhost.drawing.ports import End
from streamhost.drawing.strokes import Line, bones_of
from streamhost.drawing.symbols import EAST, GRID, STEP, WEST, WITH_HEADS, Symbol
from streamhost.drawing.table import Table
from streamhost.drawing.text import plain

HEADS = ">v<^"
ONCE, LOOPED, UPRIGHT = "-", "=", "|"
"""What wires are made of; level ones that are part of a loop are doubled."""

DOWN, DOWN_WITH_MARKS = 2, 3
"""Lines from one row to the next."""

WIRE = 2
"""Characters of wire on each side of a symbol: room for an arrow."""

BARE = (1, 1)
"""What a bend, a dot or a crossing wants instead."""

LEGEND = "(+) adds, a - beside an arrow head subtracts; [b0> and <a1] multiply; * branches, + turns, other wires only cross."


def plain_text(figure: Figure) -> str:
    """The figure without its equation, its parts one below another."""
    parts = [plain_of(figure.layout)]
    for detail in figure.details:
        parts += [f"{plain(detail.title)}:", plain_of(detail.layout)]
    parts += [*figure.notes, *([table_of(figure.table)] if figure.table is not None else []), LEGEND, figure.nature]
    return "\n\n".join(parts)


def table_of(table: Table) -> str:
    """The values of the coefficients, each column set to the right."""
    columns = [[plain(cell) for cell in column] for column in zip(table.heads, *table.rows, strict=True)]
    widths = [max(map(len, column)) for column in columns]
    lines = ["  ".join(cell.rjust(wide) for cell, wide in zip(row, widths, strict=True)).rstrip()
             for row in zip(*columns, strict=True)]
    return "\n".join(lines)


@dataclass
class Paper:
    """Characters by line and column; `lines` and `columns` say where rows and columns of the layout are."""

    lines: dict[int, int]
    columns: dict[int, int]
    characters: dict[tuple[int, int], str] = field(default_factory=dict)

    def put(self, line: int, column: int, text: str) -> None:
        for offset, character in enumerate(text):
            self.characters[line, column + offset] = character

    def rule(self, line: Line, stroke: str) -> None:
        """A wire between two places, without its ends."""
        x0, y0, x1, y1 = (round(value / GRID) for value in (line.x0, line.y0, line.x1, line.y1))
        if line.is_level:
            for column in range(self.columns[x0] + 1, self.columns[x1]):
                self.characters.setdefault((self.lines[y0], column), stroke)
        else:
            for row in range(self.lines[y0] + 1, self.lines[y1]):
                self.characters[row, self.columns[x0]] = stroke

    def text(self) -> str:
        low = min(column for _, column in self.characters)
        rows: dict[int, dict[int, str]] = {}
        for (line, column), character in self.characters.items():
            rows.setdefault(line, {})[column - low] = character
        first, last = min(rows), max(rows)
        return "\n".join(written(rows.get(line, {})) for line in range(first, last + 1))


def written(row: dict[int, str]) -> str:
    return "".join(row.get(column, " ") for column in range(max(row, default=-1) + 1))


def plain_of(layout: Layout) -> str:
    """The drawing as lines of ASCII."""
    bones = {source: bones_of(layout, source) for source in layout.nets}
    lines = [line for net in bones.values() for line in net.all]
    paper = Paper(rows_of(layout, lines), columns_of(layout, lines))
    for net in bones.values():
        for line in (line for line in net.all if line.is_level):
            paper.rule(line, LOOPED if line in net.looped else ONCE)
    for line in (line for line in lines if not line.is_level):
        paper.rule(line, UPRIGHT)
    for source in bones:
        put_knots(paper, layout, source)
    for symbol in layout.sheet.symbols:
        put_symbol(paper, symbol)
    for wire, end in zip(layout.sheet.wires, layout.sinks, strict=True):
        put_head(paper, layout.sheet.symbols[wire.sink], end, wire.sign)
    return paper.text()


def rows_of(layout: Layout, lines: Sequence[Line]) -> dict[int, int]:
    upright = any(symbol.marked and symbol.face not in (EAST, WEST) for symbol in layout.sheet.symbols)
    ys = sorted({round(y / GRID) for line in lines for y in (line.y0, line.y1)})
    return {y: i * (DOWN_WITH_MARKS if upright else DOWN) for i, y in enumerate(ys)}


def columns_of(layout: Layout, lines: Sequence[Line]) -> dict[int, int]:
    """Columns as near to each other as what stands in their rows lets them be."""
    sides = {symbol.at: sides_of(symbol) for symbol in layout.sheet.symbols}
    for line in lines:
        for x, y in ((line.x0, line.y0), (line.x1, line.y1)):
            sides.setdefault((round(x / GRID), round(y / GRID)), BARE)
    rows = {y for _, y in sides}
    for line in lines:
        for y in (y for y in rows if not line.is_level and line.y0 < y * GRID < line.y1):
            sides.setdefault((round(line.x0 / GRID), y), BARE)
    columns: dict[int, int] = {}
    free: dict[int, int] = {}
    place = 0
    for x in sorted({x for x, _ in sides}):
        here = {y: side for (column, y), side in sides.items() if column == x}
        columns[x] = place = max([place + 2, *(free[y] + side[0] for y, side in here.items() if y in free)])
        free.update((y, place + side[1]) for y, side in here.items())
    return columns


def sides_of(symbol: Symbol) -> tuple[int, int]:
    """Characters that a symbol wants to its left and right: its own and those of a wire."""
    wide = len(token(symbol))
    if symbol.kind in ("input", "output"):
        return (wide, WIRE) if is_named_left(symbol) else (WIRE, wide)
    return wide // 2 + WIRE, wide - wide // 2 + WIRE + symbol.marked


def is_named_left(symbol: Symbol) -> bool:
    """Whether the name of an input or output stands left of its place: behind the input, in front of the output."""
    return (symbol.kind == "input") == (symbol.face != WEST)


def token(symbol: Symbol) -> str:
    """What stands for a symbol."""
    if symbol.kind == "gain":
        name = plain(symbol.name)
        return {EAST: f"[{name}>", WEST: f"<{name}]"}.get(symbol.face, f"[{name}]")
    if symbol.kind in ("input", "output"):
        return plain(symbol.name)
    if symbol.kind in ("sum", "pill"):
        return "(+)"
    return "[Q]" if symbol.kind in ("mark", "round") else f"[{plain(symbol.text)}]"


def put_symbol(paper: Paper, symbol: Symbol) -> None:
    line, column = place_of(paper, symbol)
    text = token(symbol)
    left = left_of(paper, symbol)
    if symbol.kind == "pill":
        ports = [y for y in paper.lines if abs(y - symbol.at[1]) < symbol.inputs]
        for row in range(paper.lines[min(ports)], paper.lines[max(ports)] + 1):
            paper.put(row, column, "|")
    if symbol.kind in ("input", "output"):
        text, left = (f"{text} ", left) if is_named_left(symbol) else (f" {text}", left - 1)
    paper.put(line, left, text)
    if symbol.marked:
        dx, dy = STEP[symbol.face]
        paper.put(line + dy, left + len(text) if dx > 0 else left - 1 if dx < 0 else column, "Q")


def left_of(paper: Paper, symbol: Symbol) -> int:
    """The first column of a symbol's token: names of inputs and outputs stand beside their place."""
    column, wide = paper.columns[symbol.at[0]], len(token(symbol))
    if symbol.kind in ("input", "output"):
        return column - wide if is_named_left(symbol) else column + 1
    return column - wide // 2


def place_of(paper: Paper, symbol: Symbol) -> tuple[int, int]:
    return paper.lines[symbol.at[1]], paper.columns[symbol.at[0]]


def put_knots(paper: Paper, layout: Layout, source: int) -> None:
    for (x, y), mask in layout.nets[source].arms.items():
        if mask.bit_count() > 2:
            paper.put(paper.lines[y], paper.columns[x], "*")
        elif mask not in (0b0101, 0b1010):
            paper.put(paper.lines[y], paper.columns[x], "+")


def put_head(paper: Paper, symbol: Symbol, end: End, sign: int) -> None:
    if symbol.kind not in WITH_HEADS:
        return
    line, column = paper.lines[end.root[1]], paper.columns[symbol.at[0]]
    dx, dy = STEP[end.direction]
    left = column if end.root != symbol.at else left_of(paper, symbol)
    wide = 1 if end.root != symbol.at else len(token(symbol))
    if symbol.kind == "output":
        left, wide = (left, wide + 1) if is_named_left(symbol) else (left - 1, wide)
    column = left - 1 if dx > 0 else left + wide if dx < 0 else column
    paper.put(line - dy, column, HEADS[end.direction])
    if sign < 0:
        paper.put(line - dy - (dx != 0), column + (2 if dy else 0), "-")
