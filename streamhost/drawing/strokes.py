"""The lines, dots and arrow heads of a routed layout, in px."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from streamhost.drawing.board import Arms
from streamhost.drawing.layout import Layout
from streamhost.drawing.ports import End
from streamhost.drawing.symbols import GRID, HEAD, STEP, WITH_HEADS, Cell, Symbol

Spot = tuple[float, float]


@dataclass(frozen=True, order=True)
class Line:
    """A level or upright line from its left or upper end."""

    x0: float
    y0: float
    x1: float
    y1: float

    @property
    def is_level(self) -> bool:
        return self.y0 == self.y1


@dataclass(frozen=True)
class Head:
    """An arrow head: where its tip is and which way it points."""

    tip: Spot
    direction: int


@dataclass(frozen=True)
class Strokes:
    """The lines of one net, as few as possible; those that are part of a loop apart, for they are drawn heavier."""

    once: list[Line]
    looped: list[Line]

    @property
    def all(self) -> list[Line]:
        return [*self.once, *self.looped]


def lines_of(layout: Layout, source: int) -> Strokes:
    """The lines of one net from the edge of its source to the heads at its sinks."""
    symbols, wires, start = layout.sheet.symbols, layout.sheet.wires, layout.sources[source]
    first = between(edge(start, symbols[source], 1), on_page(start))
    lasts = {}
    for index in layout.sheet.sinks[source]:
        end, symbol = layout.sinks[index], symbols[wires[index].sink]
        lasts[index] = between(on_page(end), edge(end, symbol, -1, under_head(symbol)))
    return strokes(layout, source, first, lasts)


def strokes(layout: Layout, source: int, first: Line, lasts: Mapping[int, Line]) -> Strokes:
    """The net's way between its first line and its last ones, one for each wire."""
    arms, looped = layout.nets[source].arms, layout.sheet.looped.intersection(lasts)
    steps = {step for index in looped for step in way(arms, layout.sources[source].cell, layout.sinks[index].cell)}
    heavy = [*steps, *(lasts[index] for index in sorted(looped)), *([first] if looped else [])]
    light = [step for step in steps_of(arms) if step not in steps]
    light += [line for index, line in lasts.items() if index not in looped]
    return Strokes(merged(light if looped else [first, *light]), merged(heavy))


def way(arms: Arms, start: Cell, goal: Cell) -> list[Line]:
    """The steps from one cell of a tree to another."""
    before: dict[Cell, Cell] = {start: start}
    todo = [start]
    while goal not in before:
        x, y = here = todo.pop()
        for direction, (dx, dy) in enumerate(STEP):
            there = x + dx, y + dy
            if arms[here] >> direction & 1 and there in arms and there not in before:
                before[there] = here
                todo.append(there)
    steps = []
    while goal != start:
        steps.append(between(in_px(goal), in_px(before[goal])))
        goal = before[goal]
    return steps


def steps_of(arms: Arms) -> Iterator[Line]:
    """The lines from cell to cell."""
    for (x, y), mask in arms.items():
        for direction in (0, 1):
            next_x, next_y = x + STEP[direction][0], y + STEP[direction][1]
            if mask >> direction & 1 and (next_x, next_y) in arms:
                yield between(in_px((x, y)), in_px((next_x, next_y)))


def bones_of(layout: Layout, source: int) -> Strokes:
    """The lines of one net from the middle of its source to the middles of its sinks."""
    ends = {index: layout.sinks[index] for index in layout.sheet.sinks[source]}
    stubs = {index: between(on_page(end), in_px(end.root)) for index, end in ends.items()}
    start = layout.sources[source]
    return strokes(layout, source, between(on_page(start), in_px(start.root)), stubs)


def under_head(symbol: Symbol) -> float:
    """How far before a symbol its wire ends: under the arrow head, so that the tip stays sharp."""
    return HEAD[0] / 2 if symbol.kind in WITH_HEADS else 0.0


def heads_of(layout: Layout) -> Iterator[Head]:
    for wire, end in zip(layout.sheet.wires, layout.sinks, strict=True):
        symbol = layout.sheet.symbols[wire.sink]
        if symbol.kind in WITH_HEADS:
            yield Head(edge(end, symbol, -1), end.direction)


def dots_of(layout: Layout, source: int) -> list[Spot]:
    """Where three or four arms of one net meet."""
    return [in_px(cell) for cell, mask in layout.nets[source].arms.items() if mask.bit_count() > 2]


def on_page(end: End) -> Spot:
    return in_px(end.cell)


def in_px(cell: Cell) -> Spot:
    return cell[0] * GRID, cell[1] * GRID


def edge(end: End, symbol: Symbol, sense: int, off: float = 0.0) -> Spot:
    """Where a wire meets its symbol, or `off` before it; sense 1: it leaves, -1: it enters."""
    reach = (symbol.reach(end.direction) + off) * sense
    return end.root[0] * GRID + STEP[end.direction][0] * reach, end.root[1] * GRID + STEP[end.direction][1] * reach


def between(a: Spot, b: Spot) -> Line:
    return Line(*min(a, b), *max(a, b))


def merged(pieces: Sequence[Line]) -> list[Line]:
    """Lines of one net that touch end to end on one straight become one."""
    found: list[Line] = []
    level = sorted((p for p in pieces if p.is_level), key=lambda p: (p.y0, p.x0))
    for piece in level:
        last = found[-1] if found else None
        if last is not None and last.y0 == piece.y0 and piece.x0 <= last.x1:
            found[-1] = Line(last.x0, last.y0, max(last.x1, piece.x1), last.y0)
        else:
            found.append(piece)
    upright = sorted((p for p in pieces if not p.is_level), key=lambda p: (p.x0, p.y0))
    first = len(found)
    for piece in upright:
        last = found[-1] if len(found) > first else None
        if last is not None and last.x0 == piece.x0 and piece.y0 <= last.y1:
            found[-1] = Line(last.x0, last.y0, last.x0, max(last.y1, piece.y1))
        else:
            found.append(piece)
    return [line for line in found if (line.x0, line.y0) != (line.x1, line.y1)]
