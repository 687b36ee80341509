"""transposed-2: direct-2 with every arrow turned round.

    y[n]  = b0 x[n] + s1[n-1]
    sk[n] = bk x[n] - ak y[n] + s(k+1)[n-1],   k = 1 ... max(M, N)

(a bk with k > M, an ak with k > N and an s beyond the last are not there), drawn for a second-order section:

    x ---+---b0--->(+)------------+---> y
         |          ^             |
         |         z^-1           |
         |          |             |
         +---b1--->(+)<--- -a1 ---+      s1
         |          ^             |
         |         z^-1           |
         |          |             |
         +---b2--->(+)<--- -a2 ---+      s2

Nodes are evaluated in the order y, s1, s2, ...; each sum as it is written above. The delay of sk is labelled dk.

Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6, transposition of direct form II.

Counts: M + N + 1 multiplications, M + N additions, max(M, N) words of memory; a second-order section 5, 4, 2. In
fixed point three roundings a section (y, s1 and s2).

Good at: floating point, where it is the usual choice (common practice): the least memory, and no inner node that is
much larger than input and output; small terms are added to each other before they meet the large ones.

Fails: in fixed point every stored sum is rounded, and the rounding of each passes through 1 / A. Drawn whole at a high
order, the slightest change of a coefficient moves the poles far.

Arithmetic: float32 and float64. In fixed point a long state (Q1.31 and more) behind a long accumulator.

Carries: any numerator and denominator of any length, as a section or whole. Trailing zeros are left out.
"""

from streamhost.diagram.builder import Ref, Signed
from streamhost.structures.form import Draft, Form

PITCH = 1.25


def build_section(draft: Draft, x: Ref) -> Ref:
    if draft.lies:
        return draft.sums_in_rows("d", "s", x)
    b, a = draft.section.b, draft.section.a
    last = max(len(a), len(b)) - 1
    d = draft.separate("d", last, column=1.5, pitch=PITCH)
    y = draft.add("y", [draft.b(0, x, at=(0.75, 0)), *d[:1]], at=(1.5, 0))
    draft.trunk(x, (0, 0), (0, PITCH * (len(b) - 1)))
    draft.trunk(y, (3, 0), (3, PITCH * (len(a) - 1)))
    for k in range(1, last + 1):
        terms: list[Ref | Signed] = []
        if k < len(b):
            terms.append(draft.b(k, x, at=(0.75, k * PITCH)))
        if k < len(a):
            terms.append(draft.a(k, y, at=(2.25, k * PITCH)))
        s = draft.add(f"s{k}", [*terms, *d[k : k + 1]], at=(1.5, k * PITCH), face="N")
        d[k - 1].takes(s)
    return y


FORM = Form(
    name="transposed-2",
    summary="direct-2 with every arrow turned round: the usual choice in floating point",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    width=3,
    pitch=PITCH,
)
