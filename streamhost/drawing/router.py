"""All wires of a sheet: each net grows as a tree from its source; nets that overlap are taken up and laid again.

The method is negotiated congestion (McMurchie and Ebeling, 1995): an overlap is allowed at a price that rises where it
was had, until none is left. Then each net is tried once more and kept if it became cheaper.
"""

from collections import deque
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from math import inf

from streamhost.drawing.board import Arms, Board
from streamhost.drawing.ports import End, NoWayError
from streamhost.drawing.search import Query, search
from streamhost.drawing.symbols import STEP, Cell

PATIENCE = 40
"""How often a net may be laid again on average before the router gives up."""

SWEEPS = 4


@dataclass(frozen=True)
class Net:
    """A wire with its source end, its sink ends, and the cells that it is led through first."""

    number: int
    source: End
    sinks: tuple[End, ...]
    trunk: tuple[Cell, ...] = ()

    @property
    def spread(self) -> int:
        """Half the perimeter of the box around its ends."""
        cells = [self.source.cell, *(sink.cell for sink in self.sinks)]
        xs, ys = [x for x, _ in cells], [y for _, y in cells]
        return max(xs) - min(xs) + max(ys) - min(ys)

    @property
    def is_straight(self) -> bool:
        (x0, y0), (x1, y1) = self.source.cell, self.sinks[0].cell
        return len(self.sinks) == 1 and (x0 == x1 or y0 == y1)


@dataclass(frozen=True)
class Laid:
    """A net that is laid: its cells with the arms to their neighbours and into the stubs, and its cost."""

    arms: Arms
    cost: float


@dataclass
class Router:
    """Nets on a board."""

    board: Board
    nets: Sequence[Net]
    laid: dict[int, Laid] = field(default_factory=dict)

    def run(self) -> Mapping[int, Laid]:
        """Every net laid without an overlap. NoWayError where that is not found."""
        for net in self.nets:
            for end in (net.source, *net.sinks):
                self.board.own(net.number, end.stub())
        self.negotiate()
        self.clean_up()
        return self.laid

    def negotiate(self) -> None:
        queue = deque(sorted(self.nets, key=lambda net: (not net.is_straight, net.spread, net.number)))
        by_number = {net.number: net for net in self.nets}
        left = PATIENCE * len(self.nets)
        while queue:
            net = queue.popleft()
            laid = self.lay(net, nearest_first(net), overlap=True)
            left -= 1
            if laid is None or left < 0:
                raise NoWayError(f"no way for the wire of symbol {net.number}")
            for other in self.board.conflicts(net.number, laid.arms):
                self.take_up(other)
                queue.append(by_number[other])
            self.put_down(net.number, laid)

    def clean_up(self) -> None:
        for _ in range(SWEEPS):
            improved = [net for net in self.nets if self.improve(net)]
            if not improved:
                return

    def improve(self, net: Net) -> bool:
        """Whether a cheaper way was found for a net."""
        old = self.laid[net.number]
        self.take_up(net.number)
        near = nearest_first(net)
        orders = [near, near[::-1]] if len(near) > 1 and not net.trunk else [near]
        new = old
        for order in orders:
            new = self.lay(net, order, overlap=False, limit=new.cost) or new
        self.put_down(net.number, new)
        return new is not old

    def put_down(self, number: int, laid: Laid) -> None:
        self.laid[number] = laid
        self.board.put(number, laid.arms)

    def take_up(self, number: int) -> None:
        self.board.take_off(number, self.laid.pop(number).arms)

    def lay(self, net: Net, order: Sequence[End], *, overlap: bool, limit: float = inf) -> Laid | None:
        """A net with its sinks taken in an order; None where a sink cannot be reached for less than the limit."""
        tree: Arms = {net.source.cell: 1 << (net.source.direction ^ 2)}
        for here, there in pairwise((net.source.cell, *net.trunk)):
            join(tree, straight_cells(here, there))
        ends: dict[Cell, End] = {}
        cost = 0.0
        for sink in order:
            way = search(Query(self.board, net.number, tree, net.source, sink, ends, overlap, limit - cost))
            if way is None:
                return None
            join(tree, way.cells)
            tree[sink.cell] |= 1 << sink.direction
            ends[sink.cell] = sink
            cost += way.cost
        stubs = {end.cell: 1 << end.direction for end in ends.values()}
        stubs[net.source.cell] = stubs.get(net.source.cell, 0) | 1 << (net.source.direction ^ 2)
        return Laid(pruned(tree, stubs), cost)


def nearest_first(net: Net) -> list[End]:
    x, y = net.source.cell
    return sorted(net.sinks, key=lambda end: (abs(end.cell[0] - x) + abs(end.cell[1] - y), end.cell))


def join(tree: Arms, cells: Sequence[Cell]) -> None:
    """The cells, each beside the next, become part of the tree."""
    for here, there in pairwise(cells):
        direction = STEP.index((there[0] - here[0], there[1] - here[1]))
        tree[here] = tree.get(here, 0) | 1 << direction
        tree[there] = tree.get(there, 0) | 1 << (direction ^ 2)


def straight_cells(here: Cell, there: Cell) -> list[Cell]:
    dx, dy = there[0] - here[0], there[1] - here[1]
    assert dx == 0 or dy == 0, f"a trunk runs straight, not from {here} to {there}"
    length = abs(dx) + abs(dy)
    return [(here[0] + dx * k // max(length, 1), here[1] + dy * k // max(length, 1)) for k in range(length + 1)]


def pruned(tree: Arms, stubs: Arms) -> Arms:
    """The tree without ends that lead nowhere, which are those of a trunk that nothing joined; arms into stubs stay."""
    arms = dict(tree)
    loose = [cell for cell, mask in arms.items() if mask.bit_count() == 1]
    while loose:
        cell = loose.pop()
        direction = arms.pop(cell).bit_length() - 1
        neighbour = cell[0] + STEP[direction][0], cell[1] + STEP[direction][1]
        if neighbour in arms:
            arms[neighbour] &= ~(1 << (direction ^ 2)) | stubs.get(neighbour, 0)
            if arms[neighbour].bit_count() == 1:
                loose.append(neighbour)
    return arms
