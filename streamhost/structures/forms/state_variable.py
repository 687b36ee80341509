"""state-variable: two trapezoidal integrators in a loop that is solved in advance: low-pass, band-pass and high-pass at once.

    high[n] = d (x[n] - s2[n]) - e s1[n]
    band[n] = s1[n] + g high[n]                   s1[n+1] = s1[n] + 2 g high[n]
    low[n]  = s2[n] + g band[n]                   s2[n+1] = s2[n] + 2 g band[n]
    y[n]    = m2 high[n] + m1 band[n] + m0 low[n]

drawn:

    x -----+                  +------------------>(+)----------------->(+)---> y
           |                  |                    ^                    ^
           |                [m2]                 [m1]                 [m0]
           v                  |                    |                    |
          (+)----[d>--->(+)---*---[g>----*-->(+)---*---[g>----*-->(+)---+
           ^ -           ^ -             |    ^               |    ^
           |            [e]             [2]   |              [2]   |
           |             |               v    |               v    |
           |             +-*--[z^-1]<---(+)   | +--[z^-1]<---(+)   |
           |               |             ^    | |             ^    |
           |               +-------------*----+ *-------------*----+
           |                                    |
           +------------------------------------+

g = tan(pi f / rate) and 1/Q follow from A: g^2 = A(1) / A(-1), d = A(-1) / 4 = 1 / (1 + g (g + 1/Q)), e = d (g + 1/Q).
The outputs are those of the analogue filter by the bilinear transform: high (1 - z^-1)^2, band g (1 - z^-2), low g^2
(1 + z^-1)^2, all times d / A. So m0 is the gain at 0 Hz, m2 that at half the rate, m1 = 2 (b0 - b2) / (g A(-1)). All
are computed in exact numbers and rounded once. A first-order section has one integrator: u = x - s1, low = s1 + g u,
s1[n+1] = s1 + 2 g u, high = x - low, with g = A(1) / 2; y = m1 high + m0 low.

Nodes are evaluated from x to low, each integrator's state after its output; each sum as it is written, s before g, m2
first. The product g high is one node, whatever reads it.

Source: the analogue state-variable filter by the trapezoidal rule, its loop solved for high, is common practice.

Counts: 7 multiplications, 8 additions, 2 words of memory; a first-order section 3, 5, 1. g is stored once. In fixed
point six roundings (high, band, low, s1, s2, y), in a first-order section three.

Good at: filters whose frequency moves while they run: any positive g and 1/Q make a stable filter, and the
states mean the same under others. Low frequencies with a long state: a state of Q1.31 alone, all else of 16 bits,
leaves one rounding of the output (a low-pass of Q 0.707 at 100 Hz and 48 kHz: -98.7 dBFS). All three outputs at once.

Fails: a state as short as the signal: its rounding is divided by 2 g; the same filter is then 20.4 dB above one rounding
of the output, at 1 kHz 11.1 dB (direct-1: 52.1 and 22.8 dB). s1 and s2 are larger than band and low towards half the
rate: by 1 / cos(pi f / rate) at a frequency f. g is small at low frequencies, where it needs a word of its own
(coefficients = { point = "coefficient" }).

Arithmetic: state of twice the length; coefficients with a point each. In floating point as good as any.

Carries: sections of order 2 and 1, in a cascade or alone, with a numerator no longer than that, and with real or complex
poles; poles on the circle, but not at z = 1 or -1, where g would be 0 or without limit. Not a section without recursion.
"""

from fractions import Fraction

from streamhost.diagram.builder import Ref, minus
from streamhost.filters import Polynomials
from streamhost.filters.exact import rounded, square_root, value
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size

MAIN = 1.5
"""The row of the signal's way; the outputs are mixed above it, the integrators' states are below."""


def build_section(draft: Draft, x: Ref) -> Ref:
    return _second(draft, x) if len(draft.ratio.a) == 3 else _first(draft, x)


def _second(draft: Draft, x: Ref) -> Ref:
    d, e, g, m_high, m_band, m_low = _second_values(draft.ratio)
    s1 = draft.delay("s1", at=(3.5, MAIN + 1.5), face="W")
    s2 = draft.delay("s2", at=(5.75, MAIN + 1.5), face="W")
    draft.trunk(x, (1, 0), (1, MAIN - 0.75))
    u = draft.add("u", [x, minus(s2)], at=(1, MAIN))
    forward = draft.gain("d", d, u, at=(1.875, MAIN), part="a")
    damping = draft.gain("e", e, s1, at=(2.625, MAIN + 0.75), face="N", part="a")
    high = draft.add("high", [forward, minus(damping)], at=(2.625, MAIN))
    v1 = draft.gain("g", g, high, at=(3.875, MAIN), part="a")
    band = draft.add("band", [s1, v1], at=(5, MAIN))
    s1.takes(draft.add("t1", [s1, _twice(draft, "1", v1, 4.375)], at=(4.375, MAIN + 1.5), face="W"))
    v2 = draft.again(v1, "g2", band, at=(6.125, MAIN))
    low = draft.add("low", [s2, v2], at=(7.25, MAIN))
    s2.takes(draft.add("t2", [s2, _twice(draft, "2", v2, 6.625)], at=(6.625, MAIN + 1.5), face="W"))
    draft.trunk(s2, (5.25, MAIN + 1.5), (5.25, MAIN + 2.875), (1, MAIN + 2.875), (1, MAIN + 0.75))
    for name, ref, row in (("low", low, MAIN), ("band", band, -0.75), ("high", high, -1.375)):
        draft.offer(name, ref, at=(8.75, row))
    products = [
        draft.gain("m2", m_high, high, at=(3.25, MAIN - 0.75), face="N", part="b"),
        draft.gain("m1", m_band, band, at=(5.625, MAIN - 0.75), face="N", part="b"),
        draft.gain("m0", m_low, low, at=(7.875, MAIN - 0.75), face="N", part="b"),
    ]
    return draft.stride("y", products, columns=(3.25, 5.625, 7.875), row=0)


def _first(draft: Draft, x: Ref) -> Ref:
    g, m_high, m_low = _first_values(draft.ratio)
    s = draft.delay("s1", at=(1.625, MAIN + 1.5), face="W")
    draft.trunk(x, (1, 0), (3, 0))
    u = draft.add("u", [x, minus(s)], at=(1, MAIN))
    v = draft.gain("g", g, u, at=(1.875, MAIN), part="a")
    low = draft.add("low", [s, v], at=(3.125, MAIN))
    s.takes(draft.add("t1", [s, _twice(draft, "1", v, 2.5)], at=(2.5, MAIN + 1.5), face="W"))
    high = draft.add("high", [x, minus(low)], at=(3.875, 0))
    draft.offer("low", low, at=(6.375, MAIN + 0.75))
    draft.offer("high", high, at=(6.375, -0.75))
    products = [
        draft.gain("m1", m_high, high, at=(4.75, 0), part="b"),
        draft.gain("m0", m_low, low, at=(4.75, MAIN), part="b"),
    ]
    return draft.add("y", products, at=(5.5, 0))


def _twice(draft: Draft, number: str, source: Ref, column: float) -> Ref:
    return draft.shift(f"twice{number}", 1, source, at=(column, MAIN + 0.75), face="S")


def _second_values(ratio: Ratio) -> tuple[float, ...]:
    """d, e, g and the shares of the high-pass, the band-pass and the low-pass."""
    low, high, _ = _ends(ratio)
    g = square_root(low / high)
    b = [*ratio.b, Fraction(0), Fraction(0)]
    return rounded((
        high / 4,
        high * g / 4 + (1 - ratio.a[2]) / (2 * g),
        g,
        value(ratio.b, Fraction(-1)) / high,
        2 * (b[0] - b[2]) / (g * high),
        value(ratio.b, Fraction(1)) / low,
    ))


def _first_values(ratio: Ratio) -> tuple[float, ...]:
    low, high, _ = _ends(ratio)
    return rounded((low / 2, value(ratio.b, Fraction(-1)) / high, value(ratio.b, Fraction(1)) / low))


def _ends(ratio: Ratio) -> tuple[Fraction, Fraction, int]:
    """A(1), A(-1) and the order."""
    return value(ratio.a, Fraction(1)), value(ratio.a, Fraction(-1)), len(ratio.a) - 1


def carries(ratio: Ratio) -> str:
    if not ratio.is_recursive:
        return "it has no recursion, and this form is made of one or two integrators in a loop"
    low, high, order = _ends(ratio)
    if order > 2:
        return f"its recursion is of order {order}, and this form has order 1 or 2; a cascade divides it"
    if len(ratio.b) > len(ratio.a):
        return f"its numerator is of order {len(ratio.b) - 1}, higher than that of its recursion, {order}"
    if low == 0 or high == 0:
        where, gain = (1, "0") if low == 0 else (-1, "infinite")
        return f"it has a pole at z = {where}, where the integrators' gain would be {gain}"
    if order == 2 and low / high < 0:
        return "it has one real pole outside the unit circle, for which the integrators have no real gain"
    return ""


def size(section: Polynomials) -> Size:
    return Size(7.875, MAIN + 2.875) if len(section.a) == 3 else Size(5.5, MAIN + 2.25)


FORM = Form(
    name="state-variable",
    summary="two trapezoidal integrators in a loop: low-pass, band-pass and high-pass at once",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    size=size,
)
