"""all-pass-sum: half the sum of two all-passes side by side, each a chain of first- and second-order sections.

    y[n] = (u[n] + v[n]) / 2,  u and v the input through the two all-passes, with a minus where the filter has one

A section of second order has two multiplications, one of first order has one:

    y[n] = x[n-2] + c1 (x[n-1] - y[n-1]) + c2 (x[n] - y[n-2])        (c2 + c1 z^-1 + z^-2) / (1 + c1 z^-1 + c2 z^-2)
    y[n] = x[n-1] + c1 (x[n] - y[n-1])                               (c1 + z^-1) / (1 + c1 z^-1)

A pole at z = 0 is a delay in its branch. Drawn whole, and a section of second order:

    x --+--> all-pass --- u ---+
        |                      v
        |                     (+)--- 1/2 ---> y
        |                      ^
        +--> all-pass --- v ---+

    x ---+---------------->(+)<-----+  y[n-2]
         |                - |       |
       z^-1                c2     z^-1
         |                  |       |
         +------>(+)<-------|-------+  y[n-1]
         |      - |         |       |
       z^-1      c1         |     z^-1
         |        v         v       |
         +------>(+)------>(+)------+---> y

The line of y goes on where it is drawn: the next section in the branch takes its past input from it, turned over.

Sections of a branch stand in the order of their poles' angles, from z = 1 on, that of first order last; real poles by
twos make one of second order. Sums are added as they are written above, u before v. Evaluated section by section, the
upper branch first. The multipliers are numbered through: c1, c2 of the first section, c3 of the next, ...

Source: S. Mitra and K. Hirano, Digital all-pass networks, IEEE Transactions on Circuits and Systems 21 (1974); the
division of the poles: L. Gazsi, Explicit formulas for lattice wave digital filters, the same 32 (1985).

Counts: N multiplications for order N, against 2N + 1 of the direct forms; 4 additions a section of second order, 2 of
first, and one for the sum; N words of memory and as many again as the first section of each branch has order. A
third-order low-pass 3, 7, 6. In fixed point one rounding a section and one for the half; the differences are exact
sums of what is stored. Where the largest gain is not 1, a multiplication stands for the half.

Good at: odd-order low-passes and high-passes (Butterworth, Chebyshev, elliptic), half-band filters, where every second
coefficient is 0 (it keeps its multiplication), notches and band-passes of second order. However coarsely coefficients are
rounded, all-passes stay all-passes: the gain cannot exceed 1, and is 1 wherever both agree, so that the pass-band hardly
moves. The complementary filter (high-pass to a low-pass) is half the difference, for one addition more: output
"complement".

Fails: the stop-band. It is the difference of two numbers near 1, so that rounded coefficients fill it up. Elliptic
low-passes at 1, 6 and 12 kHz of 0.1 dB and 100 dB keep 75, 89 and 85 dB with coefficients of 16 bits, and their ripple (in
wave-digital 92, 93 and 95 dB; in a cascade of direct-1 97, 99 and 99 dB, and ripples of 0.16, 0.10 and 0.10 dB: measured).
A branch may clip, since an all-pass of gain 1 still has peaks above those of its input.

Arithmetic: fixed point with a long accumulator; the differences need an operand one bit longer than the signal, which
the default pre_sum gives. Poles near z = 1 need a longer state, as in direct-1.

Carries: a filter that is half the sum of two real all-passes to within -199 dB of its gain, verified in exact numbers:
low-passes and high-passes of odd order, band-passes and band-stops made from those, and whatever else is. Even-order
low-passes are not (their all-passes are complex). Draw it whole: sections of a cascade seldom are. The same with one
adaptor a multiplier: wave-digital.
"""

from streamhost.diagram.builder import Ref, minus
from streamhost.diagram.hints import Point
from streamhost.filters.exact import Polynomial
from streamhost.structures.all_pass import Branch, Halves
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.half_sum import carries, halves_of, join

PITCH = 1.25
LEFT = 0.5
"""Columns from where the input divides to the first line of delays."""

DELAY = 1.5
"""Columns of a branch's delay."""

END = 0.75
LOWER = 3.75
"""The row at which the lower branch begins, under three rows of the upper one; MIDDLE: that of the output between them."""

MIDDLE = 3.125
UNDER = 0.75
"""Rows under the upper branch for one that is a wire or a delay, which leads straight to the output."""


def build_section(draft: Draft, x: Ref) -> Ref:
    halves = halves_of(draft.ratio)
    upper, (lower, end) = Chain(draft, "u", 0.0, 1), _rows(halves)
    u = upper.build(halves.first, x)
    first = [(LEFT, 0.0)] if halves.first.sections else []
    draft.trunk(x, (0.0, 0.0), *first, (0.0, 0.0), (0.0, lower), _lead(halves.second, _middle(halves), lower))
    v = Chain(draft, "v", lower, upper.number).build(halves.second, x)
    return join(draft, halves, u, v, at=(_middle(halves), end))


def _lead(branch: Branch, middle: float, row: float) -> Point:
    """Where the input's wire to the lower branch ends: at its first delay, or, of one that is a wire, where the two meet."""
    return (middle if not branch.sections and not branch.delay else LEFT), row


def _rows(halves: Halves) -> tuple[float, float]:
    """Where the lower branch begins, and where the branches meet."""
    if halves.second.sections:
        return LOWER, MIDDLE
    down = max((len(section) - 1 for section in halves.first.sections), default=0) * PITCH + UNDER
    return down, down


def _middle(halves: Halves) -> float:
    """The column where the branches meet."""
    return LEFT + max(map(_width, (halves.first, halves.second))) + END


def _width(branch: Branch) -> float:
    return sum(len(section) for section in branch.sections) + (DELAY if branch.delay else 0.0)


def size(ratio: Ratio) -> Size:
    halves = halves_of(ratio)
    lower, end = _rows(halves)
    return Size(_middle(halves) + 0.875, lower + (2 * PITCH if halves.second.sections else 0.0), end)


class Chain:
    """A branch, section after section: the line of a section's past output is the line of the next one's past input.

    Lines run down and up by turns; a section begins at `row` where its line does, and ends where its output's begins.
    """

    def __init__(self, draft: Draft, name: str, row: float, number: int) -> None:
        self.draft, self.name, self.number = draft, name, number
        self.column, self.row, self.turn = LEFT, row, PITCH
        self.count = 0

    def build(self, branch: Branch, x: Ref) -> Ref:
        """The branch's output."""
        signals = [x]
        for section in branch.sections:
            order = len(section) - 1
            if self.count == 0:
                signals += self.line(order)
                drive(signals)
            self.count += 1
            signals = self.section(section, signals)
        if branch.delay == 0:
            return signals[0]
        at = (self.column + DELAY / 2, self.row)
        return self.draft.delay(f"{self.name}d", signals[0], at=at, n=branch.delay)

    def line(self, length: int) -> list[Ref]:
        """Delays from the current place on, driven later."""
        face = "S" if self.turn > 0 else "N"
        rows = [self.row + (k + 0.5) * self.turn for k in range(length)]
        names = [f"{self.name}{self.count}d{k + 1}" for k in range(length)]
        return [self.draft.delay(name, at=(self.column, row), face=face) for name, row in zip(names, rows, strict=True)]

    def section(self, denominator: Polynomial, x: list[Ref]) -> list[Ref]:
        """The section's output and its past, from its input and its past."""
        order, column, row, turn = len(denominator) - 1, self.column, self.row, self.turn
        self.column, self.row, self.turn = column + 1 + order, row + order * turn, -turn
        y = self.line(order)
        terms = [x[order]]
        for k in range(1, order + 1):
            start, middle, face = row + (order - k) * turn, column + k, "S" if turn > 0 else "N"
            pair = self.draft.add(f"p{self.number}", [x[order - k], minus(y[k - 1])], at=(middle, start), face=face)
            value = float(denominator[k])
            terms.append(self.draft.gain(f"c{self.number}", value, pair, at=(middle, start + turn / 2), face=face))
            self.number += 1
        adders = [(column + k, self.row) for k in range(1, order + 1)]
        output = [self.draft.chain(f"{self.name}{self.count}", terms, at=adders), *y]
        drive(output)
        return output


def drive(signals: list[Ref]) -> None:
    """Each delay from the signal before it."""
    for delay, source in zip(signals[1:], signals, strict=False):
        delay.takes(source)


FORM = Form(
    name="all-pass-sum",
    summary="half the sum of two all-passes: odd-order low-passes, half-band filters, notches",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    exact_size=size,
)
