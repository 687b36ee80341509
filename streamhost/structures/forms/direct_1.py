"""direct-1: the difference equation as it is written.

    y[n] = b0 x[n] + b1 x[n-1] + ... + bM x[n-M] - a1 y[n-1] - ... - aN y[n-N]

drawn for a second-order section:

    x ---+---b0--->(+)-----------+---> y
         |          ^            |
       z^-1         |          z^-1
         |          |            |
         +---b1--->(+)<--- -a1 --+
         |          ^            |
       z^-1         |          z^-1
         |          |            |
         +---b2--->(+)<--- -a2 --+

The one sum is added row by row from the last delay up, b before a: b2 x2 - a2 y2 + b1 x1 - a1 y1 + b0 x.

Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6, direct form I.

Counts: M + N + 1 multiplications, M + N additions, M + N words of memory; a second-order section 5, 4, 4. In fixed
point one rounding a section.

Good at: fixed point with a long accumulator. There is one rounding, and no inner node that is larger than input and
output: in two's complement the running sum may wrap as long as the final sum fits. The delays hold past input and
output and nothing else, so new coefficients of equal gain at 0 Hz disturb no constant signal.

Fails: poles near z = 1. The rounding passes through 1 / A, which is large there (low frequencies at a high rate); a
longer state or error feedback helps. With M = N it needs twice the memory of direct-2. Drawn whole at a high order, the
slightest change of a coefficient moves the poles far: divide such a filter into a cascade.

Arithmetic: a long accumulator that may wrap (16x16+40, 24x24+56); below some 200 Hz a state of twice the length
(state and operand, as in 48x24+56). In floating point as good as any.

Carries: any numerator and denominator of any length, as a section or whole. Trailing zeros are left out.
A line of more than 64 taps without recursion is one tapped-line node, added in the same order.
"""

from streamhost.diagram.builder import Ref, Signed
from streamhost.structures.form import Draft, Form


def build_section(draft: Draft, x: Ref) -> Ref:
    if draft.is_long_line:
        return draft.tapped_line(x)
    if draft.lies:
        return draft.line_in_rows("x", x)
    b, a = draft.section.b, draft.section.a
    xs = (x, *draft.line("x", len(b) - 1, x, column=0))
    ys = draft.line("y", len(a) - 1, column=4)
    terms: list[Ref | Signed] = []
    rows: list[int] = []
    for k in reversed(range(max(len(b), len(a)))):
        if k < len(b):
            terms.append(draft.b(k, xs[k], at=(1, k)))
        if 1 <= k < len(a):
            terms.append(draft.a(k, ys[k - 1], at=(3, k)))
        rows += [k] * (len(terms) - len(rows))
    y = draft.climb("y", terms, column=2, rows=rows)
    if ys:
        ys[0].takes(y)
    return y


FORM = Form(
    name="direct-1",
    summary="the difference equation as written: one sum, past input and past output kept",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    width=4,
)
