"""error-feedback-c1: direct-1 with one coefficient of error feedback, the best that one can be.

    y[n] = b0 x[n] + b1 x[n-1] + b2 x[n-2] - a1 y[n-1] - a2 y[n-2] - c1 e[n-1],   c1 = a1 / (1 + a2)

e[n] is what the rounding of y[n] dropped: the sum before minus y[n] after, without what an overflow took away. The
rounding is heard through C / A with C(z) = 1 + c1 z^-1, and this c1 makes its power least: it is -r1 / r0 of the
autocorrelation of 1 / A. Drawn for a second-order section:

    x ---+---b0--->(+)------------+-------+---> y
         |          ^             e       |
         |          |           z^-1      |
       z^-1        (+)<--- -c1 ---+     z^-1
         |          ^                     |
         +---b1--->(+)<--- -a1 -----------+
         |          ^                     |
       z^-1         |                   z^-1
         |          |                     |
         +---b2--->(+)<--- -a2 -----------+

The one sum is added row by row from the last delay up, b, a, then c: b2 x2 - a2 y2 + b1 x1 - a1 y1 - c1 e1 + b0 x.

Source: Higgins & Munson, "Noise reduction strategies for digital filters", IEEE Trans. ASSP-30 (1982).

Counts: M + N + 2 multiplications, M + N + 1 additions, M + N + 1 words of memory; a second-order section 6, 5, 5. In
fixed point one rounding a section.

Good at: poles anywhere near the circle, not only near its ends. The noise gain of a second-order section falls from that
of direct-1 to 1 / (1 - a2^2), whatever the poles' angle, and is never above it.

Fails: near z = 1 it is hardly better than error-feedback-1, which needs no multiplication (0.02 dB for poles of radius
0.99 at 1 kHz and 48 kHz), and far from error-feedback-2. Poles near z = j, -j: c1 is near 0 and nothing is gained.

Arithmetic: fixed point with an accumulator longer than the signal (16x16+40, 24x24+56): what is dropped is its lower
part. In floating point nothing is dropped that could be fed back, and the form is direct-1 with idle work.

Carries: stable sections of first and second order. A section without recursion is drawn as in direct-1.
"""

from streamhost.diagram.builder import Ref
from streamhost.filters.stability import is_stable
from streamhost.structures import shaping
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form


def build_section(draft: Draft, x: Ref) -> Ref:
    a = draft.ratio.a
    if len(a) == 1:
        return shaping.build(draft, x, [])
    c1 = a[1] / (1 + a[2] if len(a) > 2 else 1)
    return shaping.build(draft, x, [shaping.coefficient(draft, 1, float(c1))])


def carries(ratio: Ratio) -> str:
    if refused := shaping.carries(ratio):
        return refused
    if not is_stable(ratio.a):
        return "it has a pole on or outside the unit circle, where no c1 makes the noise least"
    return ""


FORM = Form(
    name="error-feedback-c1",
    summary="direct-1 with the best single coefficient of error feedback",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    size=shaping.size,
)
