"""The grid that wires are led over: what is taken, by whom, and what a step costs."""

from collections.abc import Iterable
from dataclasses import dataclass, field

from streamhost.drawing.symbols import STEP, Cell

Arms = dict[Cell, int]
"""The cells of a wire, and to which sides it goes on from each: bit 1 << direction."""

CROSSING = 14.0
BESIDE = 1.5
AROUND = 2.0
PLANNED_LABEL = 2.5
OVERLAP = 25.0
HISTORY = 4.0


def arms_across(direction: int) -> int:
    """The arms of a wire that crosses a direction straight."""
    return 0b1010 if direction % 2 == 0 else 0b0101


def arms_along(direction: int) -> int:
    return 0b0101 if direction % 2 == 0 else 0b1010


@dataclass
class Board:
    """Cells from `low` to `high`. Nets are numbers; `used` says which arms each net has in a cell."""

    low: Cell
    high: Cell
    blocked: set[Cell] = field(default_factory=set)
    owner: dict[Cell, int] = field(default_factory=dict)
    extra: dict[Cell, float] = field(default_factory=dict)
    history: dict[Cell, float] = field(default_factory=dict)
    used: dict[Cell, dict[int, int]] = field(default_factory=dict)

    def own(self, net: int, cells: Iterable[Cell]) -> None:
        """Cells that no other net may enter."""
        for cell in cells:
            self.owner.setdefault(cell, net)

    def add_cost(self, cells: Iterable[Cell], cost: float) -> None:
        for cell in cells:
            self.extra[cell] = self.extra.get(cell, 0.0) + cost

    def put(self, net: int, arms: Arms) -> None:
        for cell, mask in arms.items():
            self.used.setdefault(cell, {})[net] = mask

    def take_off(self, net: int, arms: Arms) -> None:
        for cell in arms:
            del self.used[cell][net]
            if not self.used[cell]:
                del self.used[cell]

    def enter(self, cell: Cell, direction: int, net: int, overlap: bool) -> float | None:
        """What it costs to step into a cell besides the step; None: it may not be."""
        if cell in self.blocked or not self.is_inside(cell) or self.owner.get(cell, net) != net:
            return None
        cost = self.extra.get(cell, 0.0)
        others = self.used.get(cell)
        if others is not None:
            shared = self.share(cell, others, direction, net, overlap)
            if shared is None:
                return None
            cost += shared
        along = arms_along(direction)
        for side in ((direction + 1) % 4, (direction + 3) % 4):
            beside = self.used.get((cell[0] + STEP[side][0], cell[1] + STEP[side][1]))
            if beside is not None and any(mask & along for other, mask in beside.items() if other != net):
                cost += BESIDE
        return cost

    def is_inside(self, cell: Cell) -> bool:
        return self.low[0] <= cell[0] <= self.high[0] and self.low[1] <= cell[1] <= self.high[1]

    def share(self, cell: Cell, others: dict[int, int], direction: int, net: int, overlap: bool) -> float | None:
        if all(other == net for other in others):
            return 0.0
        if len(others) == 1 and next(iter(others.values())) == arms_across(direction):
            return CROSSING
        return OVERLAP + self.history.get(cell, 0.0) if overlap else None

    def is_crossed(self, cell: Cell, net: int) -> bool:
        """Whether another net is there, so that this one may neither turn nor branch."""
        others = self.used.get(cell)
        return others is not None and any(other != net for other in others)

    def conflicts(self, net: int, arms: Arms) -> list[int]:
        """The nets that these arms overlap rather than cross, ascending; their cells become dearer."""
        found: set[int] = set()
        for cell, mask in arms.items():
            wrong = [other for other, theirs in self.used.get(cell, {}).items()
                     if other != net and {mask, theirs} != {0b0101, 0b1010}]
            if wrong:
                found.update(wrong)
                self.history[cell] = self.history.get(cell, 0.0) + HISTORY
        return sorted(found)
