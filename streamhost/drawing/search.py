"""The cheapest way for one more branch of a net: A* over cells and directions (Hart, Nilsson and Raphael, 1968)."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from heapq import heappop, heappush
from math import inf

from streamhost.drawing.board import Arms, Board
from streamhost.drawing.ports import End, bends_between
from streamhost.drawing.symbols import STEP, Cell

STRAIGHT = 1.0
BEND = 6.0
CORNER_AT_SOURCE = 10.0
CORNER_AT_SINK = 12.0
NEW_DOT = 3.0
FOUR_ARMS = 4.0
DOT_NEAR = 5.0
DOT_ON_ARROW = 30.0
DOT_AT_SOURCE = 4.0

STRAIGHT_ARMS = (0b0101, 0b1010)

State = tuple[Cell, int]


@dataclass(frozen=True)
class Way:
    """The cells of a branch from the tree to its end, and what it costs."""

    cells: tuple[Cell, ...]
    cost: float


@dataclass(frozen=True)
class Query:
    """A branch of `net` wanted from its tree to `goal`, cheaper than `limit`.

    `ends` are the sink stubs that the tree has reached.
    """

    board: Board
    net: int
    tree: Arms
    source: End
    goal: End
    ends: Mapping[Cell, End]
    overlap: bool
    limit: float = inf

    @cached_property
    def knots(self) -> set[Cell]:
        """Where the tree turns, branches or ends."""
        return {cell for cell, mask in self.tree.items() if mask not in STRAIGHT_ARMS}

    def starts(self, cell: Cell) -> Iterator[tuple[float, State]]:
        """The directions in which a branch may begin at a cell of the tree, and the price of its beginning."""
        mask = self.tree[cell]
        if cell not in self.knots and self.board.is_crossed(cell, self.net):
            return
        price = self.price_of_branch(cell, mask)
        for direction in range(4):
            if not mask >> direction & 1:
                yield price + self.price_of_turn(cell, mask, direction), (cell, direction)

    def price_of_branch(self, cell: Cell, mask: int) -> float:
        arms = mask.bit_count()
        if arms < 2:
            return 0.0
        price = NEW_DOT if arms == 2 else FOUR_ARMS
        price += DOT_AT_SOURCE if cell == self.source.cell else 0.0
        price += DOT_ON_ARROW if cell in self.ends else 0.0
        x, y = cell
        near = not self.knots.isdisjoint(((x + 1, y), (x - 1, y), (x, y + 1), (x, y - 1)))
        return price + (DOT_NEAR if near else 0.0)

    def price_of_turn(self, cell: Cell, mask: int, direction: int) -> float:
        """A lone end goes on straight for nothing."""
        if mask.bit_count() != 1 or mask == 1 << (direction ^ 2):
            return 0.0
        return BEND + (CORNER_AT_SOURCE if cell == self.source.cell else 0.0)

    def arrival(self, direction: int) -> float | None:
        if direction == self.goal.direction:
            return 0.0
        return None if direction == self.goal.direction ^ 2 else BEND + CORNER_AT_SINK

    def distance(self, cell: Cell) -> float:
        goal = self.goal.cell
        return (abs(cell[0] - goal[0]) + abs(cell[1] - goal[1])) * STRAIGHT

    def estimate(self, cell: Cell, direction: int) -> float:
        return self.distance(cell) + BEND * bends_between(cell, direction, self.goal.cell, self.goal.direction)

    def enter(self, cell: Cell, direction: int) -> float | None:
        """The price of stepping into a cell; its own tree and stubs are no way."""
        if cell in self.tree or (self.board.owner.get(cell) == self.net and cell != self.goal.cell):
            return None
        return self.board.enter(cell, direction, self.net, self.overlap)


START = 4
"""Added to the direction of a state that stands on the tree, before its first step."""

END = -1
"""The direction of the state in which the goal is reached."""


@dataclass
class Search:
    """What has been reached, from where, and what is to be looked at next."""

    query: Query
    best: dict[State, float] = field(default_factory=dict)
    before: dict[State, State] = field(default_factory=dict)
    heap: list[tuple[float, float, State]] = field(default_factory=list)

    def run(self) -> Way | None:
        goal = self.query.goal
        end = (goal.cell, END)
        waiting = sorted(((self.query.distance(cell), cell) for cell in self.query.tree), reverse=True)
        while True:
            # A cell of the tree begins nothing that costs less than its distance: it waits until that is the least.
            while waiting and not (self.heap and self.heap[0][0] < waiting[-1][0]):
                self.begin(waiting.pop()[1])
            if not self.heap:
                return None
            _, cost, state = heappop(self.heap)
            if state == end:
                return Way(self.traced(self.before[end]), cost)
            if cost > self.best[state]:
                continue
            if state[0] == goal.cell:
                self.arrive(cost, state, end)
            else:
                self.spread(cost, state)

    def begin(self, cell: Cell) -> None:
        for price, (_, direction) in self.query.starts(cell):
            self.offer(price, (cell, direction + START), None, self.query.estimate(cell, direction))

    def spread(self, cost: float, state: State) -> None:
        """On from a state: straight, or round a corner where nobody else is."""
        cell, heading = state
        if heading >= START:
            self.step(cost, cell, heading - START, state)
            return
        self.step(cost, cell, heading, state)
        if not self.query.board.is_crossed(cell, self.query.net) or self.query.overlap:
            self.step(cost + BEND, cell, (heading + 1) % 4, state)
            self.step(cost + BEND, cell, (heading + 3) % 4, state)

    def step(self, cost: float, cell: Cell, direction: int, state: State) -> None:
        target = cell[0] + STEP[direction][0], cell[1] + STEP[direction][1]
        price = self.query.enter(target, direction)
        if price is not None:
            self.offer(cost + STRAIGHT + price, (target, direction), state, self.query.estimate(target, direction))

    def arrive(self, cost: float, state: State, end: State) -> None:
        last = self.query.arrival(state[1])
        if last is not None:
            self.offer(cost + last, end, state, 0.0)

    def offer(self, cost: float, state: State, previous: State | None, ahead: float) -> None:
        if cost < self.best.get(state, inf) and cost + ahead < self.query.limit:
            self.best[state] = cost
            if previous is not None:
                self.before[state] = previous
            heappush(self.heap, (cost + ahead, cost, state))

    def traced(self, state: State) -> tuple[Cell, ...]:
        cells = [state[0]]
        while state[1] < START:
            state = self.before[state]
            cells.append(state[0])
        return tuple(reversed(cells))


def search(query: Query) -> Way | None:
    """The cheapest way, or None where there is none below the limit."""
    if query.goal.cell in query.tree and query.limit > 0:
        return Way((query.goal.cell,), 0.0)
    return Search(query).run()
