"""The lines, dots and arrow heads of a routed layout, in px."""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from streamhost.drawing.board import Arms
from streamhost.drawing.layout import Layout
from streamhost.drawing.ports import End
from streamhost.drawing.symbols import GRID, HEAD, STEP, WITH_HEADS, Symbol

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


def lines_of(layout: Layout, source: int) -> list[Line]:
    """The lines of one net, as few as possible."""
    pieces = list(steps_of(layout.nets[source].arms))
    start = layout.sources[source]
    pieces.append(between(edge(start, layout.sheet.symbols[source], 1), on_page(start)))
    for index in layout.sheet.sinks[source]:
        end, symbol = layout.sinks[index], layout.sheet.symbols[layout.sheet.wires[index].sink]
        pieces.append(between(on_page(end), edge(end, symbol, -1, under_head(symbol))))
    return merged(pieces)


def steps_of(arms: Arms) -> Iterator[Line]:
    """The lines from cell to cell."""
    for (x, y), mask in arms.items():
        for direction in (0, 1):
            next_x, next_y = x + STEP[direction][0], y + STEP[direction][1]
            if mask >> direction & 1 and (next_x, next_y) in arms:
                yield between((x * GRID, y * GRID), (next_x * GRID, next_y * GRID))


def bones_of(layout: Layout, source: int) -> list[Line]:
    """The lines of one net from the middle of its source to the middles of its sinks."""
    ends = [layout.sources[source], *(layout.sinks[index] for index in layout.sheet.sinks[source])]
    stubs = [between(on_page(end), (end.root[0] * GRID, end.root[1] * GRID)) for end in ends]
    return merged([*steps_of(layout.nets[source].arms), *stubs])


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
    return [(x * GRID, y * GRID) for (x, y), mask in layout.nets[source].arms.items() if mask.bit_count() > 2]


def on_page(end: End) -> Spot:
    return end.cell[0] * GRID, end.cell[1] * GRID


def edge(end: End, symbol: Symbol, sense: int, off: float = 0.0) -> Spot:
    """Where a wire meets its symbol, or `off` before it; sense 1: it leaves, -1: it enters."""
    reach = (symbol.reach(end.direction) + off) * sense
    return end.root[0] * GRID + STEP[end.direction][0] * reach, end.root[1] * GRID + STEP[end.direction][1] * reach


def between(a: Spot, b: Spot) -> Line:
    return Line(*min(a, b), *max(a, b))


def merged(pieces: Iterable[Line]) -> list[Line]:
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
