"""folded: a finite response with symmetric taps, the two taps of a pair added before they are multiplied.

    y[n] = b0 (x[n] + x[n-M]) + b1 (x[n-1] + x[n-M+1]) + ...      symmetric, bk = b(M-k)
    y[n] = b0 (x[n] - x[n-M]) + b1 (x[n-1] - x[n-M+1]) + ...      antisymmetric, bk = -b(M-k)

with M + 1 taps; the middle one of an odd number stands alone, drawn for five:

    x ---+--->(+)<-----+
         |     |       |
       z^-1    +-------|-----b0-----+
         |             |            |
         |           z^-1           |
         |             |            v
         +--->(+)<-----+           (+)
         |     |       |            ^
       z^-1    +-------|-----b1-----+
         |             |            |
         |           z^-1           |
         |             |            v
         +-------------+-----b2--->(+)---> y

Products are added from the outer pair inwards, the middle tap last.

Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6, structures for linear-phase FIR systems.

Counts: half the multiplications of direct-1, rounded up (an antisymmetric filter of odd length has none in the middle);
M additions and M words of memory as there. 64 taps 32, 63, 63. In fixed point one rounding.

Good at: linear-phase filters on machines where multiplications are dear.

Fails: nothing of its own. A pair needs an operand one bit longer than the signal; where a machine has none, pre_sum =
"half" or "signal" shows what it costs. No gain where a multiplier adds in the same cycle.

Arithmetic: fixed point with a long accumulator, as direct-1. In floating point a pair's sum is rounded, as in all sums.

Carries: a finite response that is symmetric or antisymmetric, of any length, to within 2^-50 of its largest tap (each
pair is then given its mean); zeros before the first tap are a delay. Draw it whole. A line of more than 16 taps is one
folded tapped-line node, of the same order and the same bits.
"""

from streamhost.diagram.builder import Ref, minus
from streamhost.filters.exact import Polynomial, rounded
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.taps import lead_of, mirrored, refused_recursion, symmetry_of

DRAWN = 16
"""Taps up to which they are drawn one by one: as many as a page holds."""

PITCH = 2.0
LEFT = 0.375
"""The column of the line that runs down, behind the wire that leads up to it from the section before."""

OUT = 0.5
"""Rows from a pair's adder to its gain, between two delays of the line that its wire crosses."""


def carries(ratio: Ratio) -> str:
    if refused := refused_recursion(ratio):
        return refused
    taps = ratio.b[lead_of(ratio.b) :]
    if symmetry_of(taps) == 0:
        return f"its {len(taps)} taps are neither symmetric nor antisymmetric"
    return ""


def build_section(draft: Draft, x: Ref) -> Ref:
    b = draft.ratio.b
    if lead := lead_of(b):
        x = draft.delay("lead", x, at=(-0.125, 0.0), n=lead)
    taps = b[lead:]
    symmetry = symmetry_of(taps)
    values = mirrored(taps, symmetry)
    if len(taps) > DRAWN:
        return draft.folded_line(x, rounded(values), "even" if symmetry > 0 else "odd")
    return Folded(draft, x, values, symmetry).build()


def size(ratio: Ratio) -> Size:
    taps = ratio.b[lead_of(ratio.b) :]
    if len(taps) > DRAWN:
        return Size(3.0, 1.0)
    rows = _rows(len(taps), symmetry_of(taps))
    return Size(LEFT + (4.25 if len(rows) > 1 else 3.0), PITCH * (len(taps) // 2), rows[-1])


def _rows(taps: int, symmetry: int) -> list[float]:
    """The rows of the gains: of the pairs, and of a middle tap."""
    pairs, middle = divmod(taps, 2)
    rows = [k * PITCH + OUT for k in range(pairs)]
    if not middle:
        return [*rows[:-1], (pairs - 1) * PITCH + 1]
    return [*rows, pairs * PITCH] if symmetry > 0 else rows


class Folded:
    """The line down on the left and up again on the right, pairs between, gains and adders beside it."""

    def __init__(self, draft: Draft, x: Ref, values: Polynomial, symmetry: int) -> None:
        self.draft, self.values, self.symmetry = draft, rounded(values), symmetry
        self.taps, self.pairs = len(values), len(values) // 2
        self.past = [x]
        for k in range(1, self.taps):
            self.past.append(draft.delay(f"x{k}", self.past[-1], at=self.place(k), face=self.face(k)))

    def place(self, k: int) -> tuple[float, float]:
        """Where the delay to x[n-k] is drawn."""
        if self.taps == 2 * k:
            return LEFT + 1, (k - 1) * PITCH
        down = 2 * k < self.taps
        return (LEFT, (k - 0.5) * PITCH) if down else (LEFT + 2, (self.taps - k - 0.5) * PITCH)

    def face(self, k: int) -> str:
        return "E" if self.taps == 2 * k else "S" if 2 * k < self.taps else "N"

    def build(self) -> Ref:
        rows = _rows(self.taps, self.symmetry)
        terms = [self.product(k, row) for k, row in enumerate(rows)]
        return self.draft.chain("y", terms, at=[(LEFT + 4.25, row) for row in rows[1:]], face="S", last="E")

    def product(self, k: int, row: float) -> Ref:
        """The product of a pair, or of the middle tap."""
        first, second = self.past[k], self.past[self.taps - 1 - k]
        operand = first
        if k < self.pairs:
            last = 2 * k + 2 == self.taps
            at, face = ((LEFT + 2, row), "E") if last else ((LEFT + 1, k * PITCH), "S")
            operand = self.draft.add(f"p{k}", [first, second if self.symmetry > 0 else minus(second)], at=at, face=face)
        return self.draft.gain(f"b{k}", self.values[k], operand, at=(LEFT + 3, row), part="b")


FORM = Form(
    name="folded",
    summary="linear-phase finite responses: the two taps of a pair are added before they are multiplied",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    exact_size=size,
)
