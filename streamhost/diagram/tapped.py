"""A tapped delay line written out as delays, gains and adders, and where those stand: side by side, row under row."""

from collections.abc import Sequence
from dataclasses import dataclass
from math import ceil

from streamhost.diagram.builder import Builder, Ref, minus
from streamhost.diagram.diagram import Diagram
from streamhost.diagram.hints import Part, Place, Point
from streamhost.diagram.nodes import Slot, Taps

MOST_TAPS = 24
"""Taps that are drawn one by one."""

A_ROW, A_ROW_FOLDED, A_ROW_SUMMED = 8, 4, 6
"""Taps side by side at most; pairs of a folded line; sums of a line that stores sums."""

GAIN_DOWN, SUM_DOWN = 0.875, 1.75
PAIR_DOWN, BACK_DOWN, FOLDED_DOWN = 1.0, 2.0, 3.0
"""Rows from the top of a line of taps to what stands below; folded, to the adders of pairs, the way back and the sums."""

LANE = 0.375
FIRST_LANE, LAST_LANE = 0.5, 0.625
"""From lane to lane, from the sums to the first and from the last to the next row."""

LEAD = 0.875
"""From a line to its input and its output."""


@dataclass(frozen=True)
class Rows:
    """Taps side by side, `a_row` in a row, `pitch` columns apart; a row is `depth` rows deep.

    `lanes` wires go on from row to row. The first is outermost at the right and innermost at the left, so that none
    crosses another. `before` and `behind`: columns that a row takes left of its first and right of its last tap.
    """

    a_row: int
    pitch: float
    depth: float
    lanes: int
    before: float
    behind: float

    def at(self, tap: int, down: float = 0.0, aside: float = 0.0) -> Point:
        """A place so many rows below a tap on the line and so many columns to its right."""
        row, column = divmod(tap, self.a_row)
        return column * self.pitch + aside, row * self.height + down

    def begins_a_row(self, tap: int) -> bool:
        """Whether what comes from the tap before comes from the row above."""
        return tap > 0 and tap % self.a_row == 0

    def way(self, tap: int, lane: int, down: float) -> tuple[Point, ...]:
        """A wire from the row above to a tap that begins a row; reversed it leads up."""
        top = tap // self.a_row * self.height
        inner = self.lanes - 1 - lane
        right = (self.a_row - 1) * self.pitch + self.behind + LANE * inner
        left = -self.before - LANE * lane
        gutter = top - self.height + self.depth + FIRST_LANE + LANE * inner
        return (right, top - self.height + down), (right, gutter), (left, gutter), (left, top + down)

    @property
    def height(self) -> float:
        """From row to row."""
        return self.depth + FIRST_LANE + LANE * (self.lanes - 1) + LAST_LANE


def line_rows(taps: int) -> Rows:
    """Of a line whose delays stand between its taps."""
    return Rows(evenly(taps, A_ROW), 1.0, SUM_DOWN, lanes=2, before=0.875, behind=0.5)


def summed_rows(taps: int) -> Rows:
    """Of a line whose delays stand between its sums, with room for a mark behind each."""
    return Rows(evenly(taps, A_ROW_SUMMED), 1.5, SUM_DOWN, lanes=2, before=1.125, behind=0.75)


def folded_rows(pairs: int) -> Rows:
    return Rows(evenly(pairs, A_ROW_FOLDED), 2.0, FOLDED_DOWN, lanes=3, before=1.375, behind=2.0)


def evenly(taps: int, most: int) -> int:
    """How many stand in a row so that all rows are about as long."""
    return ceil(taps / ceil(taps / most))


def chain(rows: Rows, order: Sequence[int], lane: int, down: float, aside: float = 0.0) -> tuple[Part, ...]:
    """The chain of adders of a line's products, which are added in an order of their taps: on from tap 0, or back to it.

    The first adder, at the second tap, takes two products.
    """
    back = order[0] > order[-1]
    parts: list[Part] = []
    for tap, following in zip(order[1:], [*order[2:], None], strict=True):
        way: tuple[Point, ...] = ()
        if following is not None and rows.begins_a_row(max(tap, following)):
            way = rows.way(max(tap, following), lane, down)
        at = rows.at(tap, down, aside)
        parts.append(Part(at, 1 if parts else 2, "W" if back else "E", way[::-1] if back else way))
    return tuple(parts)


@dataclass(frozen=True)
class Line:
    """A tapped line to be written out: its coefficients by tap, or by pair and middle tap, each a slot and its values."""

    length: int
    coefficients: tuple[tuple[Slot, Sequence[float]], ...]
    fold: str | None
    last_first: bool


def written_out(diagram: Diagram, index: int, x: str, y: str) -> tuple[Diagram, str]:
    """The taps `index` of a diagram as a diagram of their own from an input x to an output y, with places; and a caption.

    More than MOST_TAPS are written out as three that stand for all, which the caption then says.
    """
    taps = diagram.nodes[index]
    assert isinstance(taps, Taps), "only taps are written out"
    slots = [(diagram.slots[slot], diagram.values[slot].tolist()) for slot in taps.coefficients]
    if taps.last_first:
        slots.reverse()
    line, caption = Line(taps.length, tuple(slots), taps.fold, taps.last_first), ""
    if taps.length > MOST_TAPS:
        line, caption = shortened(line)
    builder = Builder()
    source = builder.place(builder.input(x), (-LEAD, 0.0))
    is_folded = line.fold is not None and line.length > 1
    result = folded_line(builder, line, source) if is_folded else plain_line(builder, line, source)
    place = builder.place_of(result)
    assert place is not None, "every node of a line has its place"
    builder.place(builder.output(result, y), ahead(place), place.face)
    return builder.build(), caption


def ahead(place: Place) -> Point:
    """Where the output of a line stands whose last node stands at a place, facing E or W: LEAD in front of it."""
    return place.at[0] + (-LEAD if place.face == "W" else LEAD), place.at[1]


def shortened(line: Line) -> tuple[Line, str]:
    """A line of three taps, or pairs, that stand for all of a long one, and how it is to be read."""
    last = len(line.coefficients) - 1
    stem = line.coefficients[0][0].label.rstrip("0123456789")
    few = tuple((Slot(stem + number, slot.section, slot.part), values)
                for number, (slot, values) in zip(("0", "_k", "_N"), line.coefficients, strict=False))
    what = "pair" if line.fold else "tap"
    length = 3 if line.fold is None else 6 if line.length % 2 == 0 else 7 if line.fold == "odd" else 5
    return Line(length, few, line.fold, line.last_first), \
        f"The {what} of k stands for all k = 1 to {last - 1}, one delay apart; N = {last}."


def plain_line(builder: Builder, line: Line, x: Ref) -> Ref:
    """Delays on top, gains under them, and the sum at the bottom: from left to right, or back if the last tap is first."""
    if line.length == 1:
        return product(builder, line, 0, x, (0.0, 0.0), "E")
    rows = line_rows(line.length)
    taps = delayed(builder, rows, line.length, x)
    products = [product(builder, line, k, taps[k], rows.at(k, GAIN_DOWN), "S") for k in range(line.length)]
    order = list(reversed(range(line.length))) if line.last_first else list(range(line.length))
    return total(builder, [products[k] for k in order], chain(rows, order, 1, SUM_DOWN))


def delayed(builder: Builder, rows: Rows, length: int, x: Ref) -> list[Ref]:
    """x and `length` - 1 delays of it side by side."""
    taps = [x]
    for k in range(1, length):
        if rows.begins_a_row(k):
            builder.trunk(taps[-1], *rows.way(k, 0, 0.0))
        taps.append(builder.place(builder.delay(f"d{k}", taps[-1]), rows.at(k, 0.0, -rows.pitch / 2)))
    return taps


def product(builder: Builder, line: Line, k: int, source: Ref, at: Point, face: str) -> Ref:
    slot, values = line.coefficients[k]
    return builder.place(builder.gain(source, slot.label, values, section=slot.section, part=slot.part), at, face)


def total(builder: Builder, products: Sequence[Ref], parts: Sequence[Part]) -> Ref:
    if len(products) == 1:
        return products[0]
    last = parts[-1]
    return builder.place(builder.sum(*products, label="sum"), last.at, last.face, parts=parts if len(parts) > 1 else ())


def folded_line(builder: Builder, line: Line, x: Ref) -> Ref:
    """The line runs to the right and back below itself; between, taps that share a coefficient are added.

    Every product but the last crosses the way back once on its way to the sums.
    """
    pairs = line.length // 2
    rows = folded_rows(pairs + line.length % 2)
    taps = there_and_back(builder, rows, line.length, x)
    products = []
    for k in range(pairs):
        aside = LEAD if 2 * (k + 1) == line.length else 0.0  # the innermost pair stands right of the delay between its taps
        far = taps[line.length - 1 - k]
        pair = builder.sum(taps[k], far if line.fold == "even" else minus(far), label=f"pair{k}")
        builder.place(pair, rows.at(k, PAIR_DOWN, aside))
        products.append(product(builder, line, k, pair, rows.at(k, PAIR_DOWN, aside + 0.75), "E"))
    if len(line.coefficients) > pairs:
        products.append(product(builder, line, pairs, taps[pairs], rows.at(pairs, PAIR_DOWN, 0.75), "E"))
    parts = list(chain(rows, range(len(products)), 2, FOLDED_DOWN, 1.5)) if len(products) > 1 else []
    if parts and line.length % 2 == 0:
        parts[-1] = Part((parts[-1].at[0] + LEAD, parts[-1].at[1]), parts[-1].terms)
    return total(builder, products, parts)


def there_and_back(builder: Builder, rows: Rows, length: int, x: Ref) -> list[Ref]:
    """x and its delays, the first half to the right, the second half two rows below to the left."""
    pairs, odd = divmod(length, 2)
    taps = [x]
    for k in range(1, length):
        across = min(k, length - k)  # what the delay stands left of
        before = taps[-1]
        delay = builder.delay(f"d{k}", before)
        taps.append(delay)
        if not odd and k == pairs:
            builder.place(delay, rows.at(k - 1, PAIR_DOWN), "S")
        elif k <= pairs:
            builder.place(delay, rows.at(across, 0.0, -rows.pitch / 2))
            if rows.begins_a_row(across):
                builder.trunk(before, *rows.way(across, 0, 0.0))
        else:
            builder.place(delay, rows.at(across, BACK_DOWN, -rows.pitch / 2), "W")
            if rows.begins_a_row(across):
                builder.trunk(delay, *reversed(rows.way(across, 1, BACK_DOWN)))
    if odd and pairs:
        builder.trunk(taps[pairs], rows.at(pairs), rows.at(pairs, BACK_DOWN))
    return taps
