"""direct-1-swapped: the recursive half of direct-1 first, each half on its own delays.

    w[n] = x[n] - a1 w[n-1] - ... - aN w[n-N]
    y[n] = b0 w[n] + b1 w[n-1] + ... + bM w[n-M]

drawn for a second-order section:

    x --->(+)----------+--- w ---+---b0--->(+)---> y
           ^           |         |          ^
           |         z^-1      z^-1         |
           |           |         |          |
          (+)<--- -a1 -+         +---b1--->(+)
           ^           |         |          ^
           |         z^-1      z^-1         |
           |           |         |          |
           +----- -a2 -+         +---b2-----+

Both delay lines hold the same values. Sums are added from the last delay up: -a2 w2 - a1 w1 + x, and
b2 w2 + b1 w1 + b0 w.

Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6: direct form I with its halves exchanged, the step
before their delays are joined.

Counts: M + N + 1 multiplications, M + N additions, M + N words of memory; a second-order section 5, 4, 4. In fixed
point two roundings a section where N > 0.

Good at: showing what the order of the two halves does while everything else stays as in direct-1, and where the two
halves run in different places.

Fails: as direct-2. The node w is the input through 1 / A, which can be larger than input and output by a factor of
thousands at low frequencies: scale it (scaling l2) or give it more integer bits. More memory than direct-2 for the
same arithmetic.

Arithmetic: floating point, or words with integer bits for what the recursion adds: its gain is met before the zeros.

Carries: any numerator and denominator of any length, as a section or whole. Without recursion w is x itself.
A line of more than 64 taps without recursion is one tapped-line node, added in the same order.
"""

from streamhost.diagram.builder import Ref
from streamhost.structures.form import Draft, Form


def build_section(draft: Draft, x: Ref) -> Ref:
    if draft.is_long_line:
        return draft.tapped_line(x)
    if draft.lies:
        return draft.line_in_rows("v", x)
    b, a = draft.section.b, draft.section.a
    ws = draft.line("w", len(a) - 1, column=1.75)
    # Only a recursion makes a w that is not yet there; without one the copy's line hangs on x.
    vs = draft.line("v", len(b) - 1, None if ws else x, column=2.5)
    fed_back = [draft.a(k, ws[k - 1], at=(0.875, k)) for k in reversed(range(1, len(a)))]
    w = draft.climb("w", [*fed_back, x], column=0, rows=range(len(a) - 1, -1, -1))
    if ws:
        ws[0].takes(w)
    if ws and vs:
        vs[0].takes(w)
    products = [draft.b(k, (w, *vs)[k], at=(3.375, k)) for k in reversed(range(len(b)))]
    return draft.climb("y", products, column=4.25, rows=range(len(b) - 1, -1, -1))


FORM = Form(
    name="direct-1-swapped",
    summary="the recursion first, then the numerator, each half on its own delays",
    begins_with="recursion",
    build_section=build_section,
    docs=__doc__,
    width=4.25,
)
