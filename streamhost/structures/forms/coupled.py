"""coupled: a pole pair p + jq, p - jq as two states that turn and shrink together, and the numerator read from the states.

    s1[n+1] = p s1[n] - q s2[n] + 2^-k x[n]
    s2[n+1] = q s1[n] + p s2[n]
    y[n]    = c2 s2[n] + c1 s1[n] + d x[n]

drawn:

    x -----*--------------------[d>------------------>(+)---> y
           |                                           ^
           |             +------<p]------+             |
           |             v               |             |
           +--[2^-1>--->(+)---->[z^-1]---*-*--[c1>--->(+)
                         ^ -               |           ^
                        [q]               [q]          |
                         |                 v           |
                         +-*--[z^-1]<-----(+)          |
                           |               ^           |
                           *----[p>--------+           |
                           |                           |
                           +------------------[c2>-----+

p = -a1 / 2 and q = sqrt(a2 - a1^2 / 4); d = b0, c1 = 2^k (b1 - b0 a1), c2 = (p c1 + 2^k (b2 - b0 a2)) / q. All are
computed in exact numbers and rounded once. 2^-k is the least power of two for which no state's power exceeds that of a
white input; where k = 0 it is not there. Another k is another program. A first-order section is s1[n+1] = p s1[n] +
2^-k x[n], y[n] = c1 s1[n] + d x[n].

The states' sums come first, then y; each sum as it is written above.

Source: Rader & Gold, Effects of parameter quantization on the poles of a digital filter, Proc. IEEE 55 (1967); Oppenheim
& Schafer, Discrete-Time Signal Processing, ch. 6, coupled form.

Counts: 7 multiplications, 5 additions, 2 words of memory, of which 4, 2 and 2 are the poles'; a first-order section
3, 2, 1. p and q are stored once. In fixed point three roundings (s1, s2, y), two in a first-order section.

Good at: fixed point. The poles lie on an even grid, whose step is that of the word, everywhere in the circle. The
roundings of both states make a noise of 1 / (1 - r^2) of one rounding's power in each state, r being the radius of the
poles, whatever their angle. For a low-pass of Q 0.707 at 48 kHz the rounding noise is 3.4 dB above that of one rounding
of the output at 100 Hz, and 5.7 dB at 1 kHz (direct-1: 52.1 and 22.8 dB). The loop shrinks every vector of states, so
that no overflow makes it oscillate, in wrapping words too.

Fails: poles that are nearly real: q is small, s2 hardly moves and c2 magnifies its rounding. Real pole pairs: there is no
q. Zeros are made by subtraction and move with every coefficient. Between sections the states are scaled for white input.

Arithmetic: as long as the signal; a longer state and operand for the last 3 dB. Coefficients of 24 bits at low
frequencies.

Carries: sections of order 2 with a conjugate pair of poles and of order 1, in a cascade or alone, with a numerator no longer
than that; stable or not (an unstable one is not scaled). Not two real poles, not a section without recursion.
"""

from fractions import Fraction

from streamhost.diagram.builder import Ref, minus
from streamhost.filters import Polynomials
from streamhost.filters.exact import rounded, square_root
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size

CORE = 1.875
"""The row of the first state."""

FLAT = 1 / 16
"""How far off the real axis poles are nearly real, in distances from the circle."""


def build_section(draft: Draft, x: Ref) -> Ref:
    """The states' loop, and the output from the last state up."""
    draft.trunk(x, (0, 0), (0, CORE))
    return _pair(draft, x) if len(draft.ratio.a) == 3 else _alone(draft, x)


def _pair(draft: Draft, x: Ref) -> Ref:
    p, q, c1, c2, d = _pair_values(draft.ratio)
    shift = scale_of(draft.ratio)
    s1 = draft.delay("s1", at=(2.125, CORE))
    s2 = draft.delay("s2", at=(2, CORE + 2.25), face="W")
    p1 = draft.gain("p", p, s1, at=(2, CORE - 0.875), face="W", part="a")
    q2 = draft.gain("q", q, s2, at=(1.25, CORE + 1.125), face="N", part="a")
    x1 = draft.shift("scale", -shift, x, at=(0.5, CORE)) if shift else x
    s1.takes(draft.add("t1", [p1, minus(q2), x1], at=(1.25, CORE)))
    q1 = draft.again(q2, "q1", s1, at=(2.875, CORE + 1.125), face="S")
    p2 = draft.again(p1, "p2", s2, at=(2, CORE + 3.125))
    s2.takes(draft.add("t2", [q1, p2], at=(2.875, CORE + 2.25), face="W"))
    outer = CORE + 3.75
    products = [
        draft.gain("c2", c2, s2, at=(3.75, outer), part="b"),
        draft.gain("c1", c1, s1, at=(3.75, CORE), part="b"),
        draft.gain("d", d, x, at=(2, 0), part="b"),
    ]
    return draft.climb("y", products, column=4.625, rows=(outer, CORE, 0))


def _alone(draft: Draft, x: Ref) -> Ref:
    ratio, shift = draft.ratio, scale_of(draft.ratio)
    p, c1, d = rounded((-ratio.a[1], 2**shift * _rest(ratio)[0], ratio.b[0]))
    s1 = draft.delay("s1", at=(2.125, CORE))
    p1 = draft.gain("p", p, s1, at=(2, CORE - 0.875), face="W", part="a")
    x1 = draft.shift("scale", -shift, x, at=(0.5, CORE)) if shift else x
    s1.takes(draft.add("t1", [p1, x1], at=(1.25, CORE)))
    products = [
        draft.gain("c1", c1, s1, at=(3.75, CORE), part="b"),
        draft.gain("d", d, x, at=(2, 0), part="b"),
    ]
    return draft.climb("y", products, column=4.625, rows=(CORE, 0))


def _pair_values(ratio: Ratio) -> tuple[float, ...]:
    """p, q, c1, c2, d: poles p +- jq, and the numerator from the states."""
    p = -ratio.a[1] / 2
    q = square_root(ratio.a[2] - p * p)
    first, second = (2 ** scale_of(ratio) * value for value in _rest(ratio))
    return rounded((p, q, first, (second + p * first) / q, ratio.b[0]))


def _rest(ratio: Ratio) -> list[Fraction]:
    """What is left of the numerator, from z^-1 on, when b0 times the denominator has been taken off."""
    b = [*ratio.b, *[Fraction(0)] * (len(ratio.a) - len(ratio.b))]
    return [value - b[0] * a for value, a in zip(b[1:], ratio.a[1:], strict=True)]


def power_of(ratio: Ratio) -> Fraction | None:
    """The power of the first state, the larger one, for a white input of power 1; None where it has no limit."""
    radius = ratio.a[2] if len(ratio.a) == 3 else ratio.a[1] ** 2
    if radius >= 1:
        return None
    if len(ratio.a) == 2:
        return 1 / (1 - radius)
    # sum of r^2n cos^2(n theta), with r^2 cos(2 theta) = p^2 - q^2
    turned = ratio.a[1] ** 2 / 2 - radius
    return (1 / (1 - radius) + (1 - turned) / (1 - 2 * turned + radius * radius)) / 2


def scale_of(ratio: Ratio) -> int:
    """The k of the 2^-k in front of the states: the least that keeps their power at most that of the input."""
    power, k = power_of(ratio), 0
    while power is not None and power > 4**k:
        k += 1
    return k


def carries(ratio: Ratio) -> str:
    if not ratio.is_recursive:
        return "it has no recursion, and this form is made of its poles"
    if len(ratio.a) > 3:
        return f"its recursion is of order {len(ratio.a) - 1}, and a pair of coupled states has order 2; a cascade divides it"
    if len(ratio.b) > len(ratio.a):
        return f"its numerator is of order {len(ratio.b) - 1}, higher than that of its recursion, {len(ratio.a) - 1}"
    if len(ratio.a) == 3 and ratio.a[1] ** 2 >= 4 * ratio.a[2]:
        return "its two poles are real, and coupled states have a conjugate pair of poles"
    return ""


def hazards(ratio: Ratio) -> tuple[str, ...]:
    """Where the poles are nearly real."""
    if len(ratio.a) != 3:
        return ()
    p, q, _, c2, _ = _pair_values(ratio)
    if q >= FLAT * abs(1 - abs(p)):
        return ()
    return ((
        f"coupled with poles at {p:.6g} +- j {q:.3g}, nearly a double real one: the second state hardly moves, and "
        f"c2 = {c2:.3g} magnifies its rounding."
    ),)


def size(section: Polynomials) -> Size:
    return Size(4.625, CORE + 3.75 if len(section.a) == 3 else CORE)


FORM = Form(
    name="coupled",
    summary="a pole pair as two states that rotate and shrink: its grid of poles is even",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    hazards=hazards,
    size=size,
)
