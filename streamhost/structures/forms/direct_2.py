"""direct-2: the recursion first, and one delay line for both halves.

    w[n] = x[n] - a1 w[n-1] - ... - aN w[n-N]
    y[n] = b0 w[n] + b1 w[n-1] + ... + bM w[n-M]

drawn for a second-order section:

    x --->(+)-----------w---+---b0--->(+)---> y
           ^                |          ^
           |              z^-1         |
           |                |          |
          (+)<---- -a1 -----+---b1--->(+)
           ^                |          ^
           |              z^-1         |
           |                |          |
           +------ -a2 -----+---b2-----+

Sums are added from the last delay up: -a2 w2 - a1 w1 + x, and b2 w2 + b1 w1 + b0 w.

Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6, direct form II (canonic direct form).

Counts: M + N + 1 multiplications, M + N additions, max(M, N) words of memory; a second-order section 5, 4, 2; with
M = N: 2N + 1, 2N, N. In fixed point two roundings a section where N > 0.

Good at: the least memory.

Fails: the node w is the input through 1 / A, which can be larger than input and output by a factor of thousands at
low frequencies: scale it (scaling l2) or give it more integer bits, or it overflows. Its state means something else
under other coefficients, so a change of coefficients is heard. Drawn whole at a high order, the slightest change of a
coefficient moves the poles far.

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
        return draft.line_in_rows("w", x)
    b, a = draft.section.b, draft.section.a
    recursive = len(a) > 1
    ws = draft.line("w", max(len(a), len(b)) - 1, None if recursive else x, column=1.75)
    fed_back = [draft.a(k, ws[k - 1], at=(0.875, k)) for k in reversed(range(1, len(a)))]
    w = draft.climb("w", [*fed_back, x], column=0, rows=range(len(a) - 1, -1, -1))
    if recursive:
        ws[0].takes(w)
    products = [draft.b(k, (w, *ws)[k], at=(2.625, k)) for k in reversed(range(len(b)))]
    return draft.climb("y", products, column=3.5, rows=range(len(b) - 1, -1, -1))


FORM = Form(
    name="direct-2",
    summary="the recursion first, then the numerator, on one shared delay line",
    begins_with="recursion",
    build_section=build_section,
    docs=__doc__,
    width=3.5,
)
