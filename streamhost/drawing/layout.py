"""From a placed sheet to a routed one: symbols, wires as cells, and the labels that found their places."""

from collections.abc import Mapping
from dataclasses import dataclass

from streamhost.drawing.board import AROUND, PLANNED_LABEL, Board
from streamhost.drawing.labels import Labelled, Shape, cells_of, first_choice, obstacles, place_labels
from streamhost.drawing.ports import End, ends_of
from streamhost.drawing.router import Laid, Net, Router
from streamhost.drawing.sheet import Sheet
from streamhost.drawing.symbols import Cell, taken

MARGIN = 14
"""Cells around the symbols in which wires may still run."""

CORNERS = frozenset({0b0011, 0b0110, 0b1100, 0b1001})
CROSSING = 3

TURNS = 3
HIT = 40.0


@dataclass(frozen=True)
class Layout:
    """A finished drawing, still on the grid. `nets` are by source symbol, `sources` and `sinks` the ends of the wires."""

    sheet: Sheet
    nets: Mapping[int, Laid]
    sources: Mapping[int, End]
    sinks: tuple[End, ...]
    labels: tuple[Labelled, ...]

    @property
    def is_clear(self) -> bool:
        """Whether every name and every value has a place where it touches nothing."""
        return not any(label.hit for label in self.labels)

    @property
    def disorder(self) -> int:
        """How little the eye likes it: bends, and crossings, of which one is as bad as CROSSING bends."""
        masks = [mask for net in self.nets.values() for mask in net.arms.values()]
        cells = [cell for net in self.nets.values() for cell in net.arms]
        return sum(mask in CORNERS for mask in masks) + CROSSING * (len(cells) - len(set(cells)))


def laid_out(sheet: Sheet) -> Layout:
    """Wires and labels for symbols that have their places. NoWayError where there is no room for a wire."""
    sources, sinks = ends_of(sheet)
    nets = [Net(source, sources[source], tuple(sinks[wire] for wire in wires), sheet.trunks.get(source, ()))
            for source, wires in sheet.sinks.items()]
    dear: list[Shape] = []
    for turn in range(TURNS + 1):
        router = Router(board_for(sheet, dear), nets)
        laid = router.run()
        labels = place_labels(sheet.symbols, obstacles(sheet, laid, sources, sinks))
        hit = [label.shape for label in labels if label.hit]
        if not hit or turn == TURNS:
            break
        dear += hit
    return Layout(sheet, laid, sources, tuple(sinks), tuple(labels))


def board_for(sheet: Sheet, dear: list[Shape]) -> Board:
    """The grid with its symbols; cells around them and those of planned labels cost more, those of `dear` much more."""
    cells = [cell for symbol in sheet.symbols for cell in taken(symbol)]
    xs, ys = [x for x, _ in cells], [y for _, y in cells]
    board = Board((min(xs) - MARGIN, min(ys) - MARGIN), (max(xs) + MARGIN, max(ys) + MARGIN), set(cells))
    board.add_cost(ring(board.blocked), AROUND)
    for symbol in sheet.symbols:
        board.add_cost(cells_of(first_choice(symbol)) if symbol.name else (), PLANNED_LABEL)
    for shape in dear:
        board.add_cost(cells_of(shape), HIT)
    return board


def ring(blocked: set[Cell]) -> list[Cell]:
    """The free cells next to taken ones."""
    around = {(x + dx, y + dy) for x, y in blocked for dx in (-1, 0, 1) for dy in (-1, 0, 1)}
    return sorted(around - blocked)
