"""zoelzer: two summing registers around the cube root of 1 + a1 + a2, for poles very near z = 1.

    u[n] = u[n-1] + 2^-m z1 v[n-1]
    h[n] = 2^m z1 (x[n] - u[n]) - z2 v[n-1]
    v[n] = v[n-1] + z1 h[n]
    y[n] = c2 u[n-1] + c1 v[n-1] + d x[n]

    A(z) = 1 - (2 - z1 z2 - z1^3) z^-1 + (1 - z1 z2) z^-2,   z1 = cbrt(1 + a1 + a2), z2 = (1 - a2) / z1
    d = b0, c1 = (b1 - b0 a1) / (2^m z1^2), c2 = B(1) / A(1) - b0

For poles of small angle theta, z1 is near theta^(2/3). The shifts keep v as large as u: 2^-m is the power of two nearest to
the root of z1 by ratio, at most 1. Without them (m = 0) nothing is drawn in their place; another m is
another program. Drawn for a second-order section:

    x ---+--------------------- d ---------------------->(+)---> y
         |                                                ^
         +-->(+)-->z1-->2^m-->(+)----+                    |
            - ^              - ^     z1                   |
              |                |     v                    |
              |                |    (+)<-----+  v         |
              |                z2    |       |            |
              |                ^    z^-1     |            |
              |                |     |       |            |
              |                +-----+-------+---- c1 -->(+)
              |  u                   |                    ^
              +<------(+)<-2^-m<-z1<-+                    |
              |        ^                                  |
              +-->z^-1-+-------------------------- c2 ----+

Nodes are evaluated in the order u, x - u, h, v, y; each sum as it is written above. x - u is a sum of stored values and not
rounded. The delay of u is labelled du, that of v dv.

Source: Zölzer, Digital Audio Signal Processing, ch. 5 (from memory: the denominator in z1 and z2, three factors z1 around the
loop; that the numerator is taken from x and the registers, and the shifts, are our own choice).

Counts: a second-order section 7, 6, 2; first order 3, 3, 1, one register u that z1 = 1 + a1 moves towards x. z1 is stored
once. In fixed point four roundings of second order (u, h, v, y), two of first.

Good at: low frequencies in short words, where even k1 of kingsbury is small: at 20 Hz and 48 kHz k1 is 0.0026, 86 steps of
a 16-bit coefficient, and z1 is 0.019, 623 steps, so that the poles can lie on a grid that much finer.

Its noise is that of kingsbury, and so is what it does with a constant.

Fails: as kingsbury, and it costs a multiplication and two shifts more.

Arithmetic: fixed point, in single words, with the full accumulator, since products are shifted; floating point.

Carries: sections of first and second order with a recursion and with 1 + a1 + a2 above 0, which every stable section has.
"""

from streamhost.diagram.builder import Ref, minus
from streamhost.diagram.hints import Point
from streamhost.filters import Polynomials
from streamhost.filters.exact import to_mpf
from streamhost.structures import integrators
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.gramians import BITS, rounded

UPPER, DOWN, ADDER, REGISTER, TAP, LOWER, BACK = 1.25, 2.0, 2.625, 3.5, 4.125, 4.875, 5.625
MOST_SHIFT = 30


def build_section(draft: Draft, x: Ref) -> Ref:
    ratio = draft.ratio
    if ratio.order < 2:
        return integrators.first_order(draft, x, "z1") if ratio.order else integrators.constant(draft, x)
    m = doublings(ratio)
    z1, z2, c1, c2 = coefficients(ratio, m)
    v1 = draft.delay("dv", at=(3.125, REGISTER), face="S")
    u1 = draft.delay("du", at=(1.0, BACK))
    draft.trunk(x, (0, 0), (0, UPPER), (0, 0), (1.5, 0))
    first = draft.gain("z1", z1, v1, at=(2.75, LOWER), face="W", part="z")
    slow = shifted(draft, "down", -m, first, (2.125, LOWER), "W")
    u = draft.add("u", [u1, slow], at=(1.5, LOWER), face="W")
    error = draft.again(first, "z1", draft.add("p", [x, minus(u)], at=(0.5, UPPER)), at=(1.25, UPPER))
    fast = shifted(draft, "up", m, error, (1.875, UPPER), "E")
    h = draft.add("h", [fast, minus(draft.gain("z2", z2, v1, at=(2.5, ADDER), face="N", part="z"))], at=(2.5, UPPER))
    turned = draft.again(first, "z1", h, at=(3.125, DOWN), face="S")
    v1.takes(draft.add("v", [v1, turned], at=(3.125, ADDER), face="S"))
    u1.takes(u)
    heard = [draft.gain("c2", c2, u1, at=(4.0, BACK), part="c"), draft.gain("c1", c1, v1, at=(4.0, TAP), part="c"),
             draft.gain("d", float(ratio.b[0]), x, at=(integrators.Y / 2, 0), part="d")]
    return draft.climb("y", heard, column=integrators.Y, rows=[BACK, TAP, 0.0])


def shifted(draft: Draft, name: str, k: int, source: Ref, at: Point, face: str) -> Ref:
    return draft.shift(name, k, source, at=at, face=face) if k else source


def doublings(ratio: Ratio) -> int:
    """m: the power of two 2^-m nearest to the root of z1 by ratio, at most 1."""
    cube, m = integrators.total(ratio.a), 0
    while m < MOST_SHIFT and cube * 64 ** (m + 1) <= 8:
        m += 1
    return m


def coefficients(ratio: Ratio, m: int) -> tuple[float, float, float, float]:
    """z1, z2, c1, c2 of a section of second order."""
    import mpmath

    with mpmath.workprec(BITS):
        z1 = mpmath.cbrt(to_mpf(integrators.total(ratio.a)))
        c1, c2 = integrators.mixed(ratio)
        return rounded(z1), rounded(to_mpf(1 - ratio.padded[1][2]) / z1), rounded(c1 / (2**m * z1**2)), rounded(c2)


def size(section: Polynomials) -> Size:
    return integrators.size(section, BACK)


FORM = Form(
    name="zoelzer",
    summary="two summing registers and the cube root of 1 + a1 + a2, for poles very near z = 1",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=integrators.carries,
    hazards=integrators.far,
    size=size,
)
