"""What the lattice forms share: reflection and ladder coefficients of a section, and how their stages stand on a page.

Of A(z) = A_N(z), with a_0 = 1, the step-down recursion gives A_(m-1) and k_m, the last coefficient of A_m. The backward
output of stage m is G_m = z^-m A_m(1/z) / A(z) times the input, and the numerator is v_0 G_0 + ... + v_M G_M. Above N
(M > N) there are no stages: G_m is G_N delayed by m - N frames.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from math import ceil

from streamhost.diagram.builder import Ref
from streamhost.diagram.hints import Point
from streamhost.filters import Polynomials
from streamhost.filters.exact import ONE, Polynomial, rounded, to_multiple
from streamhost.filters.stability import step_down
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Size

LEAST_BITS = 512


@dataclass(frozen=True)
class Lattice:
    """k_1 ... k_N and v_0 ... v_M."""

    reflections: Polynomial
    ladder: Polynomial

    @property
    def stages(self) -> int:
        return len(self.reflections)

    def k(self, m: int) -> Fraction:
        return self.reflections[m - 1]


@lru_cache(maxsize=64)
def lattice_of(ratio: Ratio) -> Lattice:
    """The coefficients of a section that `why_not` has nothing against, good to more than float64 holds.

    Exact numbers grow too long in filters of high order. The calculation is made to multiples of 2^-bits, with ever
    more bits until twice as many change no coefficient in float64; numbers of few binary digits stay exact.
    """
    bits = LEAST_BITS
    found = _to_bits(ratio, bits)
    while True:
        bits *= 2
        finer = _to_bits(ratio, bits)
        if (rounded(found.reflections), rounded(found.ladder)) == (rounded(finer.reflections), rounded(finer.ladder)):
            return finer
        found = finer


def _to_bits(ratio: Ratio, bits: int) -> Lattice:
    stages = [ONE, *reversed(list(step_down(ratio.a, bits)))]
    order = len(stages) - 1
    rest = [to_multiple(value, bits) for value in ratio.b]
    ladder: list[Fraction] = []
    for m in reversed(range(len(rest))):
        backward = [Fraction(0)] * (m - order) + list(reversed(stages[min(m, order)]))
        tap = rest.pop()
        ladder.append(tap if abs(tap) > Fraction(1, 1 << bits // 2) else Fraction(0))
        rest = [to_multiple(value - ladder[-1] * term, bits) for value, term in zip(rest, backward[:-1], strict=True)]
    return Lattice(tuple(stage[-1] for stage in stages[1:]), tuple(reversed(ladder)))


@lru_cache(maxsize=64)
def why_not(ratio: Ratio) -> str:
    """Why a section has no lattice, "" where it has."""
    if not ratio.is_recursive:
        return "it has no recursion, and a lattice is made of the recursion's reflection coefficients"
    lowest = list(step_down(ratio.a, LEAST_BITS))[-1]
    if len(lowest) > 2:
        m = len(lowest) - 1
        return f"its reflection coefficient k{m} is {round(lowest[-1])}, where the step-down to the stages below ends"
    return ""


@dataclass(frozen=True)
class Stage:
    """The grid of a lattice's stage: columns to the next one, rows to the backward line, and how many fit a page.

    `backward` is the column of the adder that makes the backward output, `delay` that of the stage's delay, `margin` what
    is left free before the first stage, for the wire that comes up from the section before.
    """

    pitch: float
    low: float
    backward: float
    delay: float
    a_row: int
    margin: float = 0.25


TAP = 0.625
"""Columns from a backward output to where the ladder taps it, to the left."""

DROP = 0.625
"""Rows from the backward line to the ladder's gains, and from there to its adders."""

BESIDE = 1.25
"""Columns of a delay before the first stage."""

WRAP = 2.0
"""Rows from the ladder of a row of stages to the next row of stages."""


@dataclass(frozen=True)
class Grid:
    """Where the N stages of a lattice stand, the highest first, in rows of equal length, `beside` delays before them."""

    stage: Stage
    stages: int
    beside: int

    @property
    def a_row(self) -> int:
        return ceil(self.stages / ceil(self.stages / self.stage.a_row))

    @property
    def left(self) -> float:
        """The first column of the first stage of every row."""
        return max(self.stage.margin, TAP - self.stage.backward) + BESIDE * self.beside

    @property
    def right(self) -> float:
        """The last column of a full row, but for the last tap."""
        return self.left + (self.a_row - 1) * self.stage.pitch + self.stage.delay + 0.5

    @property
    def ladder(self) -> float:
        """From a row of stages to its ladder."""
        return self.stage.low + 2 * DROP

    def origin(self, m: int) -> Point:
        """The first column and row of stage m; of stage 0, which has only a tap, behind stage 1."""
        row, column = divmod(self.stages - max(m, 1), self.a_row)
        return self.left + (column + (m == 0)) * self.stage.pitch, row * (self.ladder + WRAP)

    def tap(self, m: int) -> Point:
        """Where g_m is tapped."""
        column, row = self.origin(min(m, self.stages))
        beside = BESIDE * max(0, m - self.stages)
        return column + self.stage.backward - TAP - beside, row + self.stage.low

    def begins_row(self, m: int) -> bool:
        """Whether stage m is the first of a row that is not the first."""
        return 0 < m < self.stages and (self.stages - m) % self.a_row == 0

    @property
    def size(self) -> Size:
        exit = self.origin(1)[1] + self.ladder
        return Size(max(self.right, self.tap(0)[0]), exit, exit)


def size_in(stage: Stage) -> Callable[[Polynomials], Size]:
    """What a lattice of such stages takes on the page."""
    def size(section: Polynomials) -> Size:
        order = len(section.a) - 1
        return Grid(stage, order, max(0, len(section.b) - 1 - order)).size

    return size


class Pen:
    """Draws what all lattices have: the delays, the ladder, and the wires from one row of stages to the next."""

    def __init__(self, draft: Draft, stage: Stage, lattice: Lattice) -> None:
        self.draft, self.stage = draft, stage
        self.order, self.tapped = lattice.stages, len(lattice.ladder) - 1
        last = max(self.order, self.tapped)
        self.grid = Grid(stage, self.order, last - self.order)
        self.delays = {m: self._delay(m) for m in range(1, last + 1)}
        """The delay m holds g_(m-1)."""

    def _delay(self, m: int) -> Ref:
        column, row = self.grid.tap(m)
        at = self.at(m, self.stage.delay, self.stage.low) if m <= self.order else (column + BESIDE / 2, row)
        return self.draft.delay(f"d{m}", at=at, face="W")

    def at(self, m: int, column: float, row: float) -> Point:
        """A place in stage m."""
        left, top = self.grid.origin(m)
        return left + column, top + row

    def needs(self, m: int) -> bool:
        """Whether g_m is read: by the delay of a stage or beside it, or by the ladder."""
        return m < self.order or self.tapped >= self.order

    def forward(self, m: int, f: Ref) -> None:
        """f_m has been made: where stage m begins a row, its wire runs there."""
        if self.grid.begins_row(m):
            left, right, above, top = self._turn(m)
            points = (right + 0.5, above), (right + 0.5, top - 0.75), (left - 0.5, top - 0.75), (left - 0.5, top)
            self.draft.trunk(f, *points)

    def backward(self, m: int, g: Ref) -> None:
        """g_m has been made: it drives the delay m + 1, and where stage m begins a row, its wire runs back to the row above."""
        if m + 1 in self.delays:
            self.delays[m + 1].takes(g)
        if self.grid.begins_row(m):
            left, right, above, top = self._turn(m)
            low, gutter = self.stage.low, top - 1.125
            self.draft.trunk(g, (left - 1, top + low), (left - 1, gutter), (right, gutter), (right, above + low))

    def ladder(self, values: Sequence[float], g: dict[int, Ref]) -> Ref:
        """v_M g_M + ... + v_0 g_0, where `g` has those of the stages."""
        for m in range(self.order + 1, len(self.delays) + 1):
            g[m] = self.delays[m]
            self.backward(m, g[m])
        total: list[Ref] = []
        for row in self._rows():
            columns = [self.grid.tap(m)[0] for m in row]
            low = self.grid.tap(row[-1])[1]
            terms = [self.draft.gain(f"v{m}", values[m], g[m], at=(column, low + DROP), face="S", part="b")
                     for m, column in zip(row, columns, strict=True)]
            name = "y" if row[-1] == 0 else f"y{row[-1]}"
            alone = len(total) + len(terms) == 1
            columns = [columns[0] - 1.0] * len(total) + columns
            total = [self.draft.stride(name, [*total, *terms], columns=columns, row=low + 2 * DROP)]
            if row[-1]:
                self._wrap(total[0], row[-1] - 1, columns[-1], alone)
        return total[0]

    def _rows(self) -> list[list[int]]:
        """The taps, the last first, row by row."""
        rows: list[list[int]] = [[]]
        for m in range(self.tapped, -1, -1):
            if self.grid.begins_row(m) and rows[-1]:
                rows.append([])
            rows[-1].append(m)
        return rows

    def _wrap(self, total: Ref, m: int, column: float, alone: bool) -> None:
        """The ladder's sum goes on in the row that stage m begins."""
        left, _, above, top = self._turn(m)
        row, gutter, ladder = above + self.grid.ladder, top - 1.5, self.grid.ladder
        down = [(column, row)] if alone else []
        points = [(column + 0.5, row), (column + 0.5, gutter), (left - 1.5, gutter), (left - 1.5, top + ladder)]
        self.draft.trunk(total, *down, *points)

    def _turn(self, m: int) -> tuple[float, float, float, float]:
        """Where a row ends on the left and on the right, its top and the next one's, which stage m begins."""
        top = self.grid.origin(m)[1]
        return self.grid.left, self.grid.right, top - WRAP - self.grid.ladder, top
