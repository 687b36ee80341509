"""wave-digital: half the sum of two all-passes, each a chain of two-port adaptors with one multiplier.

    y[n] = (u[n] + v[n]) / 2,  u and v the input through the two all-passes, with a minus where the filter has one

(a lattice wave digital filter). An adaptor joins two ports of unequal resistance: with its coefficient g, -1 < g < 1, the
waves a1, a2 that go in and b1, b2 that come out,

    b1 = a2 + g (a2 - a1),  b2 = a1 + g (a2 - a1)

What is multiplied is at most 1/2, whichever g is; p is the product, and the sums are added as they are written:

     1/2 < g          p = (1 - g) (a1 - a2),   b1 = 2 a2 - a1 + p,   b2 = a2 + p
       0 < g <= 1/2   p = g (a2 - a1),         b1 = a2 + p,          b2 = a1 + p
    -1/2 <= g < 0     p = -g (a1 - a2),        b1 = a2 + p,          b2 = a1 + p
           g < -1/2   p = (1 + g) (a2 - a1),   b1 = a1 + p,          b2 = 2 a1 - a2 + p

Of g = 0 two wires are left. Where g < 0, the waves of the second port are larger than those of the first, and stored
times 2^-s, the least s for which white noise makes them no larger: a2 is shifted up by s, each term of b2 down. The
difference that is multiplied there has a register of its own, 2 s + 1 bits longer than the signal, which cannot clip.

A section of first order is an adaptor whose second port ends in a delay, a2 = z^-1 b2: (-g + z^-1) / (1 - g z^-1). In
one of second order the delay ends in a second adaptor, of h, and that in a delay:

    A = 1 - h (1 - g) z^-1 - g z^-2,  so that g = -a2 and h = -a1 / (1 + a2)

drawn for first order and 0 < g <= 1/2:

    x ---+--->(+)---c1---+--->(+)---> u
         |   - ^         |     ^
         |     |         v     |
         +-----|------->(+)    |        (the minus at x)
               |         |     |
               |       z^-1    |
               |         |     |
               +---------+-----+

Sections of a branch stand in the order of their poles' angles, from z = 1 on, that of first order last; of a section
the inner adaptor is evaluated first. The multipliers are numbered through, the outer adaptor's before the inner's.

Source: A. Fettweis, Wave digital filters: theory and practice, Proceedings of the IEEE 74 (1986); L. Gazsi, Explicit
formulas for lattice wave digital filters, IEEE Transactions on Circuits and Systems 32 (1985).

Counts: N multiplications for order N, 3 or 4 additions for each (4 where g is beyond 1/2 or -1/2) and one for the sum, N
words of memory. A third-order low-pass at 1 kHz and a rate of 48 kHz 3, 13, 3. In fixed point two roundings an adaptor,
one for the half.

Good at: what all-pass-sum is good at; and at poles near z = 1 and z = -1, whose multipliers are small numbers with all
their bits behind the point: in 24 bits a third-order low-pass at 100 Hz has noise of -107 dBFS where all-pass-sum has -99,
a notch at 500 Hz with Q = 30 of -122 against -105 (measured); at 1 kHz they are equal. An adaptor that is computed exactly
neither makes nor loses power, the ports weighed by their conductances, whatever g was rounded to. So where every register
only takes magnitude away (rounding = "toward-zero", overflow = "saturate", state and operand as long as the signal) the
filter is passive: without input it comes to rest from any state, and no overflow lasts.

Fails: passive with registers that round toward zero, and not with others. The default, half-up, is not free of limit
cycles here either. Rounding toward zero makes more noise, which is not white. A sine at the frequency of a pole makes the
waves of the second port as much as 2^s times too large: give such signals room. White noise with peaks of half scale clips
at most 17 of them in 48000 frames (Butterworth low-passes of orders 3, 5, 7 at 100 Hz and 1 kHz, measured); no input at
all does at -17 dBFS and 1 kHz, at -26 dBFS and 100 Hz. The stop-band is the difference of two numbers near 1, as in
all-pass-sum. More additions than other forms.

Arithmetic: fixed point with a full or long accumulator, rounding = "toward-zero" for what is said above, coefficients with
point = "coefficient". The multiplier of a port with g < 0 reads 2 s + 1 bits more than the signal, whatever the operand, so
that the port stays exact; they hold a state of up to s integer bits more than the signal. In floating point it has no
advantage.

Carries: what all-pass-sum carries: a filter that is half the sum of two real all-passes to within -199 dB of its gain,
verified in exact numbers. Draw it whole.
"""

from dataclasses import dataclass
from fractions import Fraction
from math import ceil

from streamhost.diagram.builder import Ref, Signed, minus
from streamhost.filters.exact import Polynomial
from streamhost.structures.all_pass import HALF, Branch, Halves
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.half_sum import carries, halves_of, join

COLUMNS = 3.875
"""What a section takes; an adaptor begins `LEFT` of that."""

LEFT = 0.375
END = 0.875
DELAY = 1.5
ROWS = {1: 3.75, 2: 7.5}
HALF_BAND = 5.0
"""By its order, with room for a wire over the next; and of one that is a filter in z^-2, whose second adaptor is a wire."""

OVER, ACROSS, SHIFT, LOWER, STATE, LOOP, INNER = -0.625, 0.5, 1.0, 1.625, 2.5, 3.0, 3.75
"""Rows of an adaptor: the wires over it and across it, its shifts, the adder of b2, the delay below, the wire back, and
where the next adaptor begins."""

DIFFERENCE, MULTIPLIER, PRODUCT, SECOND, OUT, BACK = 0.5, 1.25, 1.875, 2.5, 3.125, 3.5
"""Columns: d, its multiplier, p with the adder of b2 below, the adder of b1 with a2 below, the register, the way up."""


def build_section(draft: Draft, x: Ref) -> Ref:
    halves = halves_of(draft.ratio)
    upper, below = Chain(draft, "u", 0.0, 1), _depth(halves.first)
    u = upper.build(halves.first, x)
    across = [] if halves.second.sections or halves.second.delay else [(_width(halves), below)]
    draft.trunk(x, (0.0, 0.0), (0.0, below), *across)
    v = Chain(draft, "v", below, upper.number).build(halves.second, x)
    return join(draft, halves, u, v, at=(_width(halves), 0.0))


def _width(halves: Halves) -> float:
    """The column where the branches meet."""
    return max(map(_length, (halves.first, halves.second))) + END


def _length(branch: Branch) -> float:
    return COLUMNS * len(branch.sections) + (DELAY if branch.delay else 0.0)


def _depth(branch: Branch) -> float:
    return max(map(_rows, branch.sections), default=1.0)


def _rows(section: Polynomial) -> float:
    return HALF_BAND if len(section) == 3 and section[1] == 0 else ROWS[len(section) - 1]


def size(ratio: Ratio) -> Size:
    halves = halves_of(ratio)
    return Size(_width(halves) + 0.875, _depth(halves.first) + _depth(halves.second) - 0.75)


@dataclass(frozen=True)
class Adaptor:
    """Where one is drawn: a1 comes in at the top left, b1 leaves at the top right, b2 below, and a2 comes in on its right.

    `number` is its multiplier's. `inner`: what a1 is runs over the adaptor already.
    """

    draft: Draft
    number: int
    column: float
    row: float
    inner: bool = False

    def build(self, g: Fraction, a1: Ref, a2: Ref) -> tuple[Ref, Ref]:
        """b1, and b2 times 2^-s; a2 is given times 2^-s."""
        if g == 0:
            return a2, a1
        return self._of_positive(g, a1, a2) if g > 0 else self._of_negative(g, a1, a2)

    def _of_positive(self, g: Fraction, a1: Ref, a2: Ref) -> tuple[Ref, Ref]:
        if g <= HALF:
            self._lead_across(a2)
            p = self._product(g, a2, a1)
            return self._b1([a2, p]), self._b2([a1, p])
        self._lead_over(a1)
        p = self._product(1 - g, a1, a2)
        return self._b1([self._shift("twice", a2, 1, (SECOND, SHIFT), "N"), minus(a1), p]), self._b2([a2, p])

    def _of_negative(self, g: Fraction, a1: Ref, scaled: Ref) -> tuple[Ref, Ref]:
        s = scale(g)
        more = 2 * s + 1
        a2 = self._shift("up", scaled, s, (SECOND, SHIFT), "N")
        self._lead_across(a2)
        low = g >= -HALF
        if not low:
            self._lead_over(a1)
        p = self._product(-g, a1, a2, more) if low else self._product(1 + g, a2, a1, more)
        down = self._shift("down", p, -s, (PRODUCT, SHIFT), "S")
        onward = self._shift("on", a1, -s if low else 1 - s, (1.0, LOWER), "E")
        return self._b1([a2 if low else a1, p]), self._b2([onward, down] if low else [onward, minus(scaled), down])

    def _lead_across(self, a2: Ref) -> None:
        """The wire from under the adder of b1 to that of the difference."""
        self.draft.trunk(a2, self._at(SECOND, ACROSS), self._at(DIFFERENCE, ACROSS))

    def _lead_over(self, a1: Ref) -> None:
        """The wire from the input over the multiplier to the adder of b1, and back to where the input divides."""
        if not self.inner:
            way = [self._at(0, 0), self._at(0, OVER)]
            self.draft.trunk(a1, *way, self._at(SECOND, OVER), *reversed(way))

    def _product(self, multiplier: Fraction, plus: Ref, less: Ref, grow: int | None = None) -> Ref:
        d = self.draft.chain(f"d{self.number}", [plus, minus(less)], at=[self._at(DIFFERENCE, 0)], grow=grow)
        return self.draft.gain(f"c{self.number}", float(multiplier), d, at=self._at(MULTIPLIER, 0))

    def _b1(self, terms: list[Ref | Signed]) -> Ref:
        return self.draft.add(f"e{self.number}", terms, at=self._at(SECOND, 0))

    def _b2(self, terms: list[Ref | Signed]) -> Ref:
        return self.draft.add(f"f{self.number}", terms, at=self._at(PRODUCT, LOWER), face="S")

    def _shift(self, name: str, source: Ref, k: int, at: tuple[float, float], face: str) -> Ref:
        """A wire where k is 0."""
        if k == 0:
            return source
        return self.draft.shift(f"{name}{self.number}", k, source, at=self._at(*at), face=face)

    def _at(self, column: float, row: float) -> tuple[float, float]:
        return self.column + column, self.row + row

    def state(self, g: Fraction) -> Ref:
        """The delay that ends the second port, and the wire from there to a2."""
        delay = self.draft.delay(f"z{self.number}", at=self._at(PRODUCT, STATE), face="S")
        side = DIFFERENCE if g > HALF else SECOND
        self.draft.trunk(delay, self._at(PRODUCT, LOOP), self._at(side, LOOP), self._at(side, LOWER))
        return delay


def scale(g: Fraction) -> int:
    """s: the second port's waves are stored times 2^-s, so that white noise makes them no larger than at the first port.

    The power there is (1 - g) / (1 + g) times as large, behind whatever all-pass.
    """
    return (ceil((1 - g) / (1 + g) - 1).bit_length() + 1) // 2 if g < 0 else 0


class Chain:
    """A branch, section after section."""

    def __init__(self, draft: Draft, name: str, row: float, number: int) -> None:
        self.draft, self.name, self.number, self.row = draft, name, number, row
        self.column, self.count = 0.0, 0

    def build(self, branch: Branch, x: Ref) -> Ref:
        signal = x
        for section in branch.sections:
            self.count += 1
            signal = self.section(section, signal)
            self.column += COLUMNS
        if branch.delay == 0:
            return signal
        return self.draft.delay(f"{self.name}d", signal, at=(self.column + DELAY / 2, self.row), n=branch.delay)

    def section(self, denominator: Polynomial, x: Ref) -> Ref:
        """A section's output, a register: what the next one multiplies is then a sum of what is stored."""
        left = self.column + LEFT
        outer = Adaptor(self.draft, self.number, left, self.row)
        g = -denominator[-1]
        if len(denominator) == 2:
            end = outer.state(g)
            b1, b2 = outer.build(g, x, end)
        else:
            end = self.draft.delay(f"z{self.number}", at=(left + PRODUCT, self.row + STATE), face="S")
            b1, b2 = outer.build(g, x, self.back(-denominator[1] / (1 + denominator[2]), end, left))
        end.takes(b2)
        self.number += len(denominator) - 1
        return self.draft.register(f"{self.name}{self.count}", b1, at=(left + OUT, self.row))

    def back(self, h: Fraction, end: Ref, left: float) -> Ref:
        """The wave that the inner adaptor sends back, a register unless it comes from a delay."""
        row, up = self.row + INNER, (left + BACK, self.row + LOWER)
        inner = Adaptor(self.draft, self.number + 1, left, row, inner=True)
        if h == 0:
            last = self.draft.delay(f"z{self.number + 1}", end, at=(left + PRODUCT, row), face="S")
            turn = row + LOOP - STATE
            self.draft.trunk(last, (left + PRODUCT, turn), (left + BACK, turn), up, (left + SECOND, up[1]))
            return last
        self.draft.trunk(end, (left + PRODUCT, self.row + LOOP), (left, self.row + LOOP), (left, row))
        last = inner.state(h)
        b1, b2 = inner.build(h, end, last)
        last.takes(b2)
        wave = self.draft.register(f"w{self.number + 1}", b1, at=(left + OUT, row))
        self.draft.trunk(wave, (left + BACK, row), up, (left + SECOND, up[1]))
        return wave


FORM = Form(
    name="wave-digital",
    summary="half the sum of two all-passes made of adaptors: passive where registers round toward zero",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    exact_size=size,
)
