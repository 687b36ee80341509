"""error-feedback: direct-1 with the best error feedback, C = A: a state of twice the length in single words.

    y[n] = b0 x[n] + b1 x[n-1] + b2 x[n-2] - a1 y[n-1] - a2 y[n-2] - c1 e[n-1] - c2 e[n-2],   c1 = a1, c2 = a2

e[n] is what the rounding of y[n] dropped: the sum before minus y[n] after, without what an overflow took away. The
rounding is heard through C / A. Least power asks R c = -r with the autocorrelation r of 1 / A, and these are the equations
that the denominator of 1 / A itself solves: c = a, and the rounding is heard white, as it is made. y and e together
are the sum before its rounding, so that what is multiplied by a is the whole of it. Drawn for a second-order section:

    x ---+---b0--->(+)------------+-------+---> y
         |          ^             e       |
         |          |           z^-1      |
       z^-1        (+)<--- -c1 ---+     z^-1
         |          ^             |       |
         +---b1--->(+)<--- -a1 ---|-------+
         |          ^           z^-1      |
       z^-1        (+)<--- -c2 ---+     z^-1
         |          ^                     |
         +---b2--->(+)<--- -a2 -----------+

The one sum is added row by row from the last delay up, b, a, then c:
b2 x2 - a2 y2 - c2 e2 + b1 x1 - a1 y1 - c1 e1 + b0 x.

Source: Higgins & Munson, "Noise reduction strategies for digital filters", IEEE Trans. ASSP-30 (1982); Mullis & Roberts,
"An interpretation of error spectrum shaping in digital filters", IEEE Trans. ASSP-30 (1982).

Counts: M + 2N + 1 multiplications, M + 2N additions, M + 2N words of memory; a second-order section 7, 6, 6. In fixed
point one rounding a section, and the products of what is dropped are cut to the accumulator.

Good at: any poles. The noise of a section is that of its one rounding, for poles of any radius and angle, on a machine
that multiplies single words. Where no product is cut and nothing overflows it is direct-1 with state and operand at the
accumulator's word, bit for bit.

Fails: an accumulator too short to hold what is dropped times c: the products are floored to it, and the noise of that
passes through 1 / A. Near z = 1 error-feedback-2 comes close without multiplications.

Arithmetic: fixed point with a long accumulator (16x16+40, 24x24+56), or the full one. In floating point nothing is
dropped that could be fed back, and the form is direct-1 with idle work.

Carries: sections of first and second order. A section without recursion is drawn as in direct-1.
"""

from streamhost.diagram.builder import Ref
from streamhost.structures import shaping
from streamhost.structures.form import Draft, Form


def build_section(draft: Draft, x: Ref) -> Ref:
    a = draft.section.a
    return shaping.build(draft, x, [shaping.coefficient(draft, k, a[k]) for k in range(1, len(a))])


FORM = Form(
    name="error-feedback",
    summary="direct-1 with error feedback by the whole denominator: as good as a state of twice the length",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=shaping.carries,
    size=shaping.size,
)
