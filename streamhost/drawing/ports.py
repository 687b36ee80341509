"""Where wires leave and enter symbols, and how far they run straight there."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise, permutations

from streamhost.drawing.sheet import Sheet, Wire
from streamhost.drawing.symbols import (
    GRID,
    HEAD,
    MOST_ON_CIRCLE,
    STEP,
    WITH_HEADS,
    Cell,
    Symbol,
    in_stub,
    input_ports,
    least_out,
    out_stub,
)

BEND = 10.0
DISTANCE = 0.5


class NoWayError(Exception):
    """There is no room for a wire; the placement must be looser."""


@dataclass(frozen=True)
class End:
    """One end of a wire: the symbol's centre line at `root`, the cell where it is free to turn, the direction of travel."""

    root: Cell
    cell: Cell
    direction: int

    @property
    def line(self) -> tuple[Cell, Cell]:
        return self.root, self.cell

    def stub(self) -> list[Cell]:
        """The cells from the root to the free one, which belong to the wire."""
        (x0, y0), (x1, y1) = self.line
        length = span(*self.line)
        return [(x0 + (x1 - x0) * k // length, y0 + (y1 - y0) * k // length) for k in range(length + 1)]


def fewest_bends(ahead: int, aside: int, turn: int) -> int:
    """Bends of the best way to a place `ahead` and `aside` (to the right), to arrive turned by `turn` quarters."""
    if turn == 3:
        aside, turn = -aside, 1
    if turn == 0:
        if aside == 0 and ahead >= 0:
            return 0
        return 2 if ahead >= 0 else 4
    if turn == 1:
        return 1 if ahead >= 0 and aside >= 0 else 3
    return 2 if aside != 0 else 4


def bends_between(start: Cell, direction: int, goal: Cell, arrival: int) -> int:
    """The same on the grid."""
    dx, dy = goal[0] - start[0], goal[1] - start[1]
    ahead, right = STEP[direction], STEP[(direction + 1) % 4]
    return fewest_bends(dx * ahead[0] + dy * ahead[1], dx * right[0] + dy * right[1], (arrival - direction) % 4)


def ends_of(sheet: Sheet) -> tuple[dict[int, End], list[End]]:
    """The source end of each net, and the sink end of each wire."""
    sources = {source: source_end(sheet.symbols[source], out_stub(sheet.symbols[source])) for source in sheet.sinks}
    entering: dict[int, list[int]] = {}
    for index, wire in enumerate(sheet.wires):
        entering.setdefault(wire.sink, []).append(index)
    sinks: dict[int, End] = {}
    for symbol, wires in entering.items():
        ports = [sink_end(sheet.symbols[symbol], *port) for port in input_ports(sheet.symbols[symbol])]
        starts = [[sources[source], *on_trunk(sources[source], sheet.trunks.get(source, ()))]
                  for source in (sheet.wires[wire].source for wire in wires)]
        sinks.update(zip(wires, chosen(sheet.symbols[symbol], starts, ports), strict=True))
    for index, wire in enumerate(sheet.wires):
        meet(sheet.symbols, wire, index, sources, sinks)
    return sources, [sinks[index] for index in range(len(sheet.wires))]


def source_end(symbol: Symbol, length: int) -> End:
    return End(symbol.at, along(symbol.at, symbol.face, length), symbol.face)


def sink_end(symbol: Symbol, direction: int, offset: Cell) -> End:
    root = symbol.at[0] + offset[0], symbol.at[1] + offset[1]
    return End(root, along(root, direction, -in_stub(symbol, direction)), direction)


def along(cell: Cell, direction: int, steps: int) -> Cell:
    return cell[0] + STEP[direction][0] * steps, cell[1] + STEP[direction][1] * steps


def on_trunk(source: End, points: Sequence[Cell]) -> list[End]:
    """The points of a trunk as ends that a branch may start from, in the direction of the wire."""
    legs = pairwise((source.cell, *points))
    return [End(there, there, direction_of(here, there)) for here, there in legs if here != there]


def direction_of(here: Cell, there: Cell) -> int:
    dx, dy = there[0] - here[0], there[1] - here[1]
    return STEP.index(((dx > 0) - (dx < 0), (dy > 0) - (dy < 0)))


def chosen(symbol: Symbol, starts: Sequence[Sequence[End]], ports: Sequence[End]) -> list[End]:
    """A port for each wire into a symbol: the cheapest choice of sides, or, many on one side, from the top down.

    `starts` are the places from which each wire may come.
    """
    if len(starts) > MOST_ON_CIRCLE:
        order = sorted(range(len(starts)), key=lambda i: (starts[i][0].cell[1], starts[i][0].cell[0], i))
        port_of = dict(zip(order, ports, strict=True))
        return [port_of[i] for i in range(len(starts))]
    choices = permutations(ports, len(starts))
    return list(min(choices, key=lambda choice: sum(map(cheapest, starts, choice))))


def cheapest(starts: Sequence[End], end: End) -> float:
    return min(wire_cost(start, end) for start in starts)


def wire_cost(start: End, end: End) -> float:
    """Fewest bends first, then distance."""
    if straight_ahead(start, end):
        start, end = replace(start, cell=start.root), replace(end, cell=end.root)
    bends = bends_between(start.cell, start.direction, end.cell, end.direction)
    return BEND * bends + DISTANCE * span(start.cell, end.cell)


def span(a: Cell, b: Cell) -> int:
    return abs(a[0] - b[0]) + abs(a[1] - b[1])


def straight_ahead(start: End, end: End) -> bool:
    """Whether a wire runs from symbol to symbol without a bend."""
    dx, dy = end.root[0] - start.root[0], end.root[1] - start.root[1]
    ahead = STEP[start.direction]
    return start.direction == end.direction and dx * ahead[1] == dy * ahead[0] == 0 and dx * ahead[0] + dy * ahead[1] > 0


def meet(symbols: Sequence[Symbol], wire: Wire, index: int, sources: dict[int, End], sinks: dict[int, End]) -> None:
    """Two ends that face each other and are nearer than their stubs meet in between."""
    start, end = sources[wire.source], sinks[index]
    distance = span(start.root, end.root)
    if not straight_ahead(start, end) or distance >= span(*start.line) + span(*end.line):
        return
    length = max(least_out(symbols[wire.source]), distance - span(*end.line))
    sink = symbols[wire.sink]
    taken = symbols[wire.source].out_reach + sink.reach(end.direction) + (HEAD[0] if sink.kind in WITH_HEADS else 0.0)
    if distance * GRID < taken or (distance - length) * GRID < sink.reach(end.direction):
        raise NoWayError(f"no room between symbols {symbols[wire.source].id} and {symbols[wire.sink].id}")
    sources[wire.source] = source_end(symbols[wire.source], length)
    sinks[index] = End(end.root, sources[wire.source].cell, end.direction)
