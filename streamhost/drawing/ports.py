"""Where wires leave and enter symbols, and how far they run straight there."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import permutations

from streamhost.drawing.sheet import Sheet, Wire
from streamhost.drawing.symbols import MOST_ON_CIRCLE, STEP, Cell, Symbol, in_stub, input_ports, least_out, out_stub

BEND = 10.0
DISTANCE = 0.5


@dataclass(frozen=True)
class End:
    """One end of a wire: the symbol's centre line at `root`, the cell where it is free to turn, the direction of travel."""

    root: Cell
    cell: Cell
    direction: int

    def stub(self) -> list[Cell]:
        """The cells from the root to the free one, which belong to the wire."""
        (x0, y0), (x1, y1) = self.root, self.cell
        length = abs(x1 - x0) + abs(y1 - y0)
        if length == 0:
            return [self.root]
        dx, dy = (x1 - x0) // length, (y1 - y0) // length
        return [(x0 + dx * k, y0 + dy * k) for k in range(length + 1)]


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
        starts = [sources[sheet.wires[wire].source] for wire in wires]
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


def chosen(symbol: Symbol, starts: Sequence[End], ports: Sequence[End]) -> list[End]:
    """A port for each wire into a symbol: the cheapest choice of sides, or, many on one side, from the top down."""
    if len(starts) > MOST_ON_CIRCLE:
        order = sorted(range(len(starts)), key=lambda i: (starts[i].cell[1], starts[i].cell[0], i))
        port_of = dict(zip(order, ports, strict=True))
        return [port_of[i] for i in range(len(starts))]
    choices = permutations(ports, len(starts))
    return list(min(choices, key=lambda choice: sum(map(wire_cost, starts, choice))))


def wire_cost(start: End, end: End) -> float:
    """Fewest bends first, then distance."""
    distance = abs(start.cell[0] - end.cell[0]) + abs(start.cell[1] - end.cell[1])
    return BEND * bends_between(start.cell, start.direction, end.cell, end.direction) + DISTANCE * distance


def meet(symbols: Sequence[Symbol], wire: Wire, index: int, sources: dict[int, End], sinks: dict[int, End]) -> None:
    """Two ends that face each other and are nearer than their stubs meet in between."""
    start, end = sources[wire.source], sinks[index]
    ahead = STEP[start.direction]
    dx, dy = end.root[0] - start.root[0], end.root[1] - start.root[1]
    distance = dx * ahead[0] + dy * ahead[1]
    straight = start.direction == end.direction and dx * ahead[1] == 0 and dy * ahead[0] == 0 and distance > 0
    own = abs(start.cell[0] - start.root[0]) + abs(start.cell[1] - start.root[1])
    other = abs(end.cell[0] - end.root[0]) + abs(end.cell[1] - end.root[1])
    if not straight or distance >= own + other:
        return
    length = max(least_out(symbols[wire.source]), distance - other)
    sources[wire.source] = source_end(symbols[wire.source], length)
    sinks[index] = End(end.root, sources[wire.source].cell, end.direction)
