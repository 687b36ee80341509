"""Symbols and their measures. Places are cells of a grid of 8 px; extents are in px.

Directions are numbers: 0 east, 1 south, 2 west, 3 north.
"""

from dataclasses import dataclass
from math import ceil

from streamhost.drawing.text import Label, width

GRID = 8
COLUMN = 8
"""Cells of a hint's column or row."""

Cell = tuple[int, int]

EAST, SOUTH, WEST, NORTH = range(4)
STEP: tuple[Cell, ...] = ((1, 0), (0, 1), (-1, 0), (0, -1))
SIDES = "ESWN"

RADIUS = 10.0
TERMINAL = 3.0
DOT = 2.8
HEAD = (8.0, 6.4)
TRIANGLE = 12.0
MARK = 13.0
MARK_GAP = 4.0
BOX_HEIGHT = 28
CLEAR = 3.0
"""Least distance of a wire from a symbol that is not its own."""

MOST_ON_CIRCLE = 3
WITH_HEADS = frozenset({"sum", "pill", "delay", "output", "round", "residue", "taps"})


@dataclass(frozen=True)
class Symbol:
    """A drawn node, or one adder of a sum that is drawn as several.

    `text` stands in the symbol, `name` and `value` beside it; `half` is half its width and height; `marked`: rounded,
    so that an open square with Q stands on the wire that leaves it.
    """

    kind: str
    node: int
    part: int
    at: Cell
    face: int = EAST
    half: tuple[float, float] = (0.0, 0.0)
    text: Label = ()
    name: Label = ()
    value: Label = ()
    inputs: int = 1
    marked: bool = False

    @property
    def id(self) -> str:
        return f"{self.node}.{self.part}"

    def reach(self, direction: int) -> float:
        """From the centre to the edge, in px."""
        return self.half[direction % 2]

    @property
    def out_reach(self) -> float:
        """From the centre to where the wire leaves, past the mark."""
        return self.reach(self.face) + (MARK_GAP + MARK if self.marked else 0.0)


def box(text: Label) -> tuple[float, float]:
    """Half the size of a box around a text: whole and even, so that its edges lie on whole pixels."""
    wanted = ceil((width(text) + 10) / 2) * 2
    return max(32, wanted) / 2, BOX_HEIGHT / 2


def pill(inputs: int) -> tuple[float, float]:
    """Half the size of an upright adder of many inputs, which are two cells apart."""
    return RADIUS, float(GRID * inputs)


def out_stub(symbol: Symbol) -> int:
    """Cells that a wire runs straight from the centre before it may turn."""
    if symbol.kind in ("input", "output"):
        return 2
    return max(3, ceil((symbol.out_reach + 7) / GRID)) if not symbol.marked else least_out(symbol)


def in_stub(symbol: Symbol, direction: int) -> int:
    """The same for a wire that enters in a direction."""
    return 2 if symbol.kind == "output" else max(3, ceil((symbol.reach(direction) + 7) / GRID))


def least_out(symbol: Symbol) -> int:
    """The same where the next symbol is so near that the wire runs straight into it."""
    return ceil(symbol.out_reach / GRID)


def input_ports(symbol: Symbol) -> tuple[tuple[int, Cell], ...]:
    """Where wires may enter: the direction of travel, and the cell that they run to, from the centre."""
    if symbol.kind == "pill":
        return tuple((symbol.face, (0, 2 * i - symbol.inputs + 1)) for i in range(symbol.inputs))
    if symbol.kind == "sum":
        return tuple((side ^ 2, (0, 0)) for side in (WEST, NORTH, SOUTH, EAST) if side != symbol.face)
    return ((symbol.face, (0, 0)),)


def taken(symbol: Symbol) -> list[Cell]:
    """The cells that no wire may enter: those of the symbol, and those beside the mark on its wire."""
    across, down = (int((half + CLEAR - 0.001) // GRID) for half in symbol.half)
    x, y = symbol.at
    cells = [(x + dx, y + dy) for dx in range(-across, across + 1) for dy in range(-down, down + 1)]
    if symbol.marked:
        (ahead, aside), past = (STEP[symbol.face], STEP[(symbol.face + 1) % 4]), least_out(symbol)
        cells += [(x + ahead[0] * k + aside[0] * side, y + ahead[1] * k + aside[1] * side)
                  for k in range(1, past + 1) for side in (-1, 1)]
    return cells
