"""Where names and values stand: above a gain or beside it, at the first place where they touch nothing."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from math import ceil, floor

from streamhost.drawing.board import Arms
from streamhost.drawing.ports import End
from streamhost.drawing.router import Laid
from streamhost.drawing.sheet import Sheet
from streamhost.drawing.symbols import GRID, HEAD, MARK, MARK_GAP, STEP, Cell, Symbol
from streamhost.drawing.text import SIZE, Label, width

ASCENT, DESCENT = 0.76 * SIZE, 0.38 * SIZE
"""How far a line of text with a subscript reaches above and below its base line."""

VALUE_SIZE = 9.0
VALUE_ASCENT, VALUE_DESCENT = 0.76 * VALUE_SIZE, 0.24 * VALUE_SIZE

OFF = 4.0
SHIFTS = (0.0, 8.0, -8.0, 14.0, -14.0)
WIRE_ROOM = 1.5
MINUS_LENGTH = 7.0
MINUS_OFF = 8.0
MINUS_OFF_CROWDED = 5.5


@dataclass(frozen=True)
class Shape:
    """A rectangle in px."""

    left: float
    top: float
    right: float
    bottom: float

    def meets(self, other: "Shape") -> bool:
        return self.left < other.right and other.left < self.right and self.top < other.bottom and other.top < self.bottom

    def grown(self, by: float) -> "Shape":
        return Shape(self.left - by, self.top - by, self.right + by, self.bottom + by)

    def overlap(self, other: "Shape") -> float:
        across = min(self.right, other.right) - max(self.left, other.left)
        return max(0.0, across) * max(0.0, min(self.bottom, other.bottom) - max(self.top, other.top))


@dataclass(frozen=True)
class Labelled:
    """The name or the value of a symbol at its place; `hit`: it touches something all the same."""

    symbol: Symbol
    shape: Shape
    hit: bool
    is_value: bool = False

    @property
    def text(self) -> Label:
        return self.symbol.value if self.is_value else self.symbol.name

    @property
    def base(self) -> tuple[float, float]:
        """Where the text begins, on its base line."""
        return self.shape.left, self.shape.top + (VALUE_ASCENT if self.is_value else ASCENT)


def candidates(symbol: Symbol) -> Iterator[Shape]:
    """Places of a symbol's name, the best first."""
    x, y = symbol.at[0] * GRID, symbol.at[1] * GRID
    wide, high = width(symbol.name), ASCENT + DESCENT
    across, down = symbol.half
    middle = y - high / 2
    right, left = Shape(x + across + OFF, middle, x + across + OFF + wide, middle + high), \
        Shape(x - across - OFF - wide, middle, x - across - OFF, middle + high)
    above = Shape(x - wide / 2, y - down - 2 - high, x + wide / 2, y - down - 2)
    below = Shape(x - wide / 2, y + down + 2, x + wide / 2, y + down + 2 + high)
    if symbol.kind in ("input", "output"):
        behind = left if (symbol.kind == "input") == (symbol.face == 0) else right
        yield from (behind, above, below)
        return
    sides = (above, below) if symbol.face % 2 == 0 else (right, left)
    for shift in SHIFTS:
        for side in sides:
            dx, dy = (shift, 0.0) if symbol.face % 2 == 0 else (0.0, shift)
            yield Shape(side.left + dx, side.top + dy, side.right + dx, side.bottom + dy)


def value_candidates(symbol: Symbol) -> Iterator[Shape]:
    """Places of a gain's value: below a level one, else above; on the lower right of an upright one, else left."""
    x, y = symbol.at[0] * GRID, symbol.at[1] * GRID
    wide, high = width(symbol.value, VALUE_SIZE), VALUE_ASCENT + VALUE_DESCENT
    across, down = symbol.half
    if symbol.face % 2 == 0:
        tops = (y + down + 2, y - down - 2 - high)
        for shift in SHIFTS:
            yield from (Shape(x - wide / 2 + shift, top, x + wide / 2 + shift, top + high) for top in tops)
        return
    right, left, low = x + across + OFF, x - across - OFF, y + (ASCENT + DESCENT) / 2 + 2
    yield Shape(right, low, right + wide, low + high)
    yield Shape(left - wide, y - high / 2, left, y + high / 2)
    yield Shape(right - across, low, right - across + wide, low + high)


def first_choice(symbol: Symbol) -> Shape:
    return next(candidates(symbol))


def cells_of(shape: Shape) -> list[Cell]:
    """The cells whose wires would run through a shape."""
    xs = range(ceil(shape.left / GRID), floor(shape.right / GRID) + 1)
    ys = range(ceil(shape.top / GRID), floor(shape.bottom / GRID) + 1)
    return [(x, y) for x in xs for y in ys]


def place_labels(symbols: Sequence[Symbol], obstacles: Sequence[Shape]) -> list[Labelled]:
    """Every name, then every value, at its first free place, or where it covers least."""
    there = list(obstacles)
    labels: list[Labelled] = []
    wanted = [(symbol, False, candidates(symbol)) for symbol in symbols if symbol.name]
    wanted += [(symbol, True, value_candidates(symbol)) for symbol in symbols if symbol.value]
    for symbol, is_value, places in wanted:
        shapes = list(places)
        free = next((shape for shape in shapes if not any(map(shape.meets, there))), None)
        shape = free or min(shapes, key=lambda shape: sum(map(shape.overlap, there)))
        labels.append(Labelled(symbol, shape, free is None, is_value))
        there.append(shape)
    return labels


def obstacles(sheet: Sheet, nets: Mapping[int, Laid], sources: Mapping[int, End], sinks: Sequence[End]) -> list[Shape]:
    """All that a name must not touch."""
    shapes = [body(symbol) for symbol in sheet.symbols]
    shapes += [mark for symbol in sheet.symbols if symbol.marked for mark in [mark_shape(symbol)]]
    for laid in nets.values():
        shapes += wire_shapes(laid.arms)
    shapes += [stub_shape(end) for end in (*sources.values(), *sinks)]
    shapes += [minus_shape(sheet.symbols[wire.sink], end).grown(1.0)
               for wire, end in zip(sheet.wires, sinks, strict=True) if wire.sign < 0]
    return shapes


def body(symbol: Symbol) -> Shape:
    x, y = symbol.at[0] * GRID, symbol.at[1] * GRID
    return Shape(x - symbol.half[0], y - symbol.half[1], x + symbol.half[0], y + symbol.half[1])


def mark_shape(symbol: Symbol) -> Shape:
    """The open square on the wire that leaves a rounded symbol."""
    off = symbol.reach(symbol.face) + MARK_GAP + MARK / 2
    x = symbol.at[0] * GRID + STEP[symbol.face][0] * off
    y = symbol.at[1] * GRID + STEP[symbol.face][1] * off
    return Shape(x, y, x, y).grown(MARK / 2)


def minus_shape(sink: Symbol, end: End) -> Shape:
    """The dash beside the arrow head of a term that is subtracted: above a level one, right of an upright one."""
    off = sink.reach(end.direction) + HEAD[0] / 2
    x = end.root[0] * GRID - STEP[end.direction][0] * off
    y = end.root[1] * GRID - STEP[end.direction][1] * off
    if end.direction % 2 == 0:
        y -= MINUS_OFF_CROWDED if sink.kind == "pill" else MINUS_OFF
    else:
        x += MINUS_OFF + MINUS_LENGTH / 2 - HEAD[1] / 2
    return Shape(x - MINUS_LENGTH / 2, y, x + MINUS_LENGTH / 2, y)


def stub_shape(end: End) -> Shape:
    (x0, y0), (x1, y1) = end.root, end.cell
    xs, ys = sorted((x0 * GRID, x1 * GRID)), sorted((y0 * GRID, y1 * GRID))
    room = HEAD[1] / 2 if end.cell != end.root else WIRE_ROOM
    return Shape(xs[0], ys[0], xs[1], ys[1]).grown(room)


def wire_shapes(arms: Arms) -> Iterable[Shape]:
    """The runs between cells, with a little room."""
    for (x, y), mask in arms.items():
        for direction in (0, 1):
            if mask >> direction & 1:
                dx, dy = STEP[direction]
                yield Shape(x * GRID, y * GRID, (x + dx) * GRID, (y + dy) * GRID).grown(WIRE_ROOM)
