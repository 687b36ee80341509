"""kingsbury: two summing registers around the root of 1 + a1 + a2, for poles near z = 1.

    u[n] = u[n-1] + k1 v[n-1]
    h[n] = x[n] - u[n] - k2 v[n-1]
    v[n] = v[n-1] + k1 h[n]
    y[n] = c2 u[n-1] + c1 v[n-1] + d x[n]

    A(z) = 1 - (2 - k1 k2 - k1^2) z^-1 + (1 - k1 k2) z^-2,   k1 = sqrt(1 + a1 + a2), k2 = (1 - a2) / k1
    d = b0, c1 = (b1 - b0 a1) / k1, c2 = B(1) / A(1) - b0

For poles of small angle theta and a quality Q, k1 is near theta and k2 near 1 / Q. Drawn for a second-order section:

    x ---+------------------------ d ------------------------>(+)---> y
         |                 +<------------+                     ^
         |                 v             |                     |
         +->(+)->(+)--k1->(+)---> z^-1 --+-------- c1 -------->(+)
           - ^  - ^    v                 |                     ^
             |    +<--------- k2 --------+                     |
             |         u                 |                     |
             +<----+----(+)<----- k1 ----+                     |
                   |     ^                                     |
                   +-z^-1+------------------------ c2 ---------+

Nodes are evaluated in the order u, h, v, y; each sum as it is written above. The delay of u is labelled du, that of v dv.

Source: N. Kingsbury, "Second-order recursive digital-filter element for poles near the unit circle and the real z axis",
Electronics Letters 8 (1972); Zölzer, Digital Audio Signal Processing, ch. 5 (both from memory: the denominator in k1 and
k2; that the numerator is taken from x and the registers is our own choice). The recursion is that of
state-variable-delayed with F = k1, q = k2, whose numerator is mixed from its high, band and low outputs.

Counts: a second-order section 6, 6, 2; first order 3, 3, 1, one register u that k1 = 1 + a1 moves towards x. k1 is stored
once. In fixed point four roundings of second order (u, h, v, y), two of first.

Good at: low frequencies in short words. k1 and k2 say the distance of the poles from z = 1 with their first bits. u is the
low-passed input, v reaches Q times it, so that no register needs integer bits for the recursion. Its noise grows by 3 dB
an octave as the frequency falls, where direct-1's grows by 9: it is 32 dB below it for a low-pass of Q 0.707 at 100 Hz
and 48 kHz. In float32 that low-pass at 20 Hz had noise of -170 dBFS on white noise of -10 dBFS peak, direct-1 of
-117. A constant rests at u = x, v = 0 whatever the coefficients are: new ones of equal gain at 0 Hz disturb none.

Fails: above a quarter of the rate its registers become several times larger than input and output. h, the high-passed
input, can reach 2.4 times it (Q 0.707). A pole at z = 1 cannot be drawn.

Arithmetic: fixed point, in single words; floating point.

Carries: sections of first and second order with a recursion and with 1 + a1 + a2 above 0, which every stable section has.
"""

from streamhost.diagram.builder import Ref, minus
from streamhost.filters import Polynomials
from streamhost.filters.exact import to_mpf
from streamhost.structures import integrators
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.gramians import BITS, rounded

UPPER, K2, LOWER, BACK = 1.75, 2.625, 3.5, 4.25
"""Rows: the register v, k2, the sum u, the register u."""


def build_section(draft: Draft, x: Ref) -> Ref:
    ratio = draft.ratio
    if ratio.order < 2:
        return integrators.first_order(draft, x, "k1") if ratio.order else integrators.constant(draft, x)
    k1, k2, c1, c2 = coefficients(ratio)
    v1 = draft.delay("dv", at=(3.125, UPPER))
    u1 = draft.delay("du", at=(1.375, BACK))
    draft.trunk(x, (0, 0), (0, UPPER), (0, 0), (1.5, 0))
    slow = draft.gain("k1", k1, v1, at=(2.75, LOWER), face="W", part="k")
    u = draft.add("u", [u1, slow], at=(2.0, LOWER), face="W")
    damped = draft.gain("k2", k2, v1, at=(2.375, K2), face="W", part="k")
    h = draft.chain("h", [x, minus(u), minus(damped)], at=[(0.5, UPPER), (1.0, UPPER)])
    v1.takes(draft.add("v", [v1, draft.again(slow, "k1", h, at=(1.75, UPPER))], at=(2.25, UPPER)))
    u1.takes(u)
    heard = [draft.gain("c2", c2, u1, at=(integrators.C, BACK), part="c"),
             draft.gain("c1", c1, v1, at=(integrators.C, UPPER), part="c"),
             draft.gain("d", float(ratio.b[0]), x, at=(integrators.Y / 2, 0), part="d")]
    return draft.climb("y", heard, column=integrators.Y, rows=[BACK, UPPER, 0.0])


def coefficients(ratio: Ratio) -> tuple[float, float, float, float]:
    """k1, k2, c1, c2 of a section of second order."""
    import mpmath

    with mpmath.workprec(BITS):
        k1 = mpmath.sqrt(to_mpf(integrators.total(ratio.a)))
        c1, c2 = integrators.mixed(ratio)
        return rounded(k1), rounded(to_mpf(1 - ratio.padded[1][2]) / k1), rounded(c1 / k1), rounded(c2)


def size(section: Polynomials) -> Size:
    return integrators.size(section, BACK)


FORM = Form(
    name="kingsbury",
    summary="two summing registers and sqrt(1 + a1 + a2), for poles near z = 1",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=integrators.carries,
    hazards=integrators.far,
    size=size,
)
