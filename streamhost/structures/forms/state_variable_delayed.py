"""state-variable-delayed: two integrators in a loop, the second on a delayed value: low-pass, band-pass and high-pass at once.

    low[n]  = low[n-1] + F band[n-1]
    high[n] = x[n] - low[n] - q band[n-1]
    band[n] = band[n-1] + F high[n]
    y[n]    = m2 high[n] + m1 band[n] + m0 low[n]

drawn:

    x -----+           +------------->(+)------------------------------->(+)---> y
           |           |               ^                                  ^
           |         [m2]            [m1]                               [m0]
           v           |               |                                  |
          (+)--->(+)---*--[F>--->(+)---*->[z^-1]---*--[F>--->(+)----------*
           ^ -    ^ -             ^                |          ^           |
           |      |               |                |          +--[z^-1]<--*
           |      |               |                |                      |
           |      +-------<q]-----*----------------+                      |
           |                                                              |
           +--------------------------------------------------------------+

F = 2 sin(pi f / rate) and q = 1/Q for poles of the radius 1 - Fq: F^2 = A(1), q = (1 - a2) / F, and A = 1 - (2 - Fq -
F^2) z^-1 + (1 - Fq) z^-2. The outputs are high (1 - z^-1)^2, band F (1 - z^-1), low F^2 z^-1, all over A, so that
m0 is the gain at 0 Hz, m2 = b2 and m1 = (b0 - b2) / F. All are computed in exact numbers and rounded once. A
first-order section is high = x - low[n-1], low = low[n-1] + F high with F = A(1); y = m1 high + m0 low.

Nodes are evaluated low, high, band, y; each sum as it is written.

Source: Dattorro, Effect design, part 1, J. Audio Eng. Soc. 45 (1997), Chamberlin's state-variable filter.

Counts: 6 multiplications, 6 additions, 2 words of memory; a first-order section 3, 3, 1. F is stored once. In fixed
point four roundings (low, high, band, y), in a first-order section two.

Good at: few operations, and a frequency that is one coefficient, F. Every stable section has an F and a q. For a
low-pass of Q 0.707 at 48 kHz its rounding noise is 20.4 dB above that of one rounding of the output at 100 Hz and 10.8 dB
at 1 kHz (direct-1: 52.1 and 22.8 dB); with a state and operand of Q1.31 at 100 Hz that of the output alone.

Fails: it is stable only while 0 < Fq < 2 and F^2 + 2 Fq < 4, that is F < sqrt(q^2 + 4) - q: with q fixed, a frequency
that is tuned up runs away from there on (Q = 0.707: 0.173 of the rate; Q = 10: 0.4). F and q of a bilinear design at
high frequencies are not those of the frequency and the Q that it was asked for.

Arithmetic: low and band as state with more bits than the signal. Low frequencies; above a sixth of the rate rather
state-variable.

Carries: sections of order 2 and 1, in a cascade or alone, with a numerator no longer than that, whose A(1) is above 0 (of
the first order: not 0): all stable ones. Not a section without recursion.
"""

from fractions import Fraction
from math import sqrt

from streamhost.diagram.builder import Ref, minus
from streamhost.filters import Polynomials
from streamhost.filters.exact import rounded, square_root, value
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size

MAIN = 1.5
"""The row of the signal's way; the outputs are mixed above it, the loops are below."""

NEAR = 0.9
"""The share of the highest stable F above which a section is dangerous to tune."""


def build_section(draft: Draft, x: Ref) -> Ref:
    draft.trunk(x, (1, 0), (1, MAIN - 0.75))
    return _second(draft, x) if len(draft.ratio.a) == 3 else _first(draft, x)


def _second(draft: Draft, x: Ref) -> Ref:
    tuning, damping, m_high, m_band, m_low = _second_values(draft.ratio)
    b1 = draft.delay("band1", at=(4.875, MAIN))
    l1 = draft.delay("low1", at=(7.25, MAIN + 0.875), face="W")
    f = draft.gain("F", tuning, b1, at=(6, MAIN), part="a")
    low = draft.add("low", [l1, f], at=(6.75, MAIN))
    l1.takes(low)
    q = draft.gain("q", damping, b1, at=(3, MAIN + 1.625), face="W", part="a")
    high = draft.stride("high", [x, minus(low), minus(q)], columns=(1, 1, 1.75), row=MAIN)
    band = draft.add("band", [b1, draft.again(f, "F2", high, at=(3, MAIN), )], at=(3.75, MAIN))
    b1.takes(band)
    for name, ref, row in (("low", low, MAIN), ("band", band, -0.75), ("high", high, -1.375)):
        draft.offer(name, ref, at=(8.75, row))
    draft.trunk(b1, (5.5, MAIN), (5.5, MAIN + 1.625), (4.25, MAIN + 1.625))
    draft.trunk(low, (7.875, MAIN), (7.875, MAIN + 2.25), (1, MAIN + 2.25), (1, MAIN + 0.75))
    products = [
        draft.gain("m2", m_high, high, at=(2.375, MAIN - 0.75), face="N", part="b"),
        draft.gain("m1", m_band, band, at=(4.375, MAIN - 0.75), face="N", part="b"),
        draft.gain("m0", m_low, low, at=(7.875, MAIN - 0.75), face="N", part="b"),
    ]
    return draft.stride("y", products, columns=(2.375, 4.375, 7.875), row=0)


def _first(draft: Draft, x: Ref) -> Ref:
    tuning, m_high, m_low = _first_values(draft.ratio)
    l1 = draft.delay("low1", at=(3.5, MAIN + 0.875), face="W")
    high = draft.add("high", [x, minus(l1)], at=(1, MAIN))
    f = draft.gain("F", tuning, high, at=(2.25, MAIN), part="a")
    low = draft.add("low", [l1, f], at=(3, MAIN))
    l1.takes(low)
    draft.offer("low", low, at=(5.0, MAIN))
    draft.offer("high", high, at=(5.0, -0.75))
    products = [
        draft.gain("m1", m_high, high, at=(1.625, MAIN - 0.75), face="N", part="b"),
        draft.gain("m0", m_low, low, at=(4.125, MAIN - 0.75), face="N", part="b"),
    ]
    return draft.stride("y", products, columns=(1.625, 4.125), row=0)


def _second_values(ratio: Ratio) -> tuple[float, ...]:
    """F, q and the shares of the high-pass, the band-pass and the low-pass."""
    low = value(ratio.a, Fraction(1))
    tuning = square_root(low)
    b = [*ratio.b, Fraction(0), Fraction(0)]
    return rounded((
        tuning, (1 - ratio.a[2]) / tuning, b[2], (b[0] - b[2]) / tuning, value(ratio.b, Fraction(1)) / low,
    ))


def _first_values(ratio: Ratio) -> tuple[float, ...]:
    low = value(ratio.a, Fraction(1))
    b = [*ratio.b, Fraction(0)]
    return rounded((low, -b[1], value(ratio.b, Fraction(1)) / low))


def carries(ratio: Ratio) -> str:
    if not ratio.is_recursive:
        return "it has no recursion, and this form is made of one or two integrators in a loop"
    low, order = value(ratio.a, Fraction(1)), len(ratio.a) - 1
    if order > 2:
        return f"its recursion is of order {order}, and this form has order 1 or 2; a cascade divides it"
    if len(ratio.b) > len(ratio.a):
        return f"its numerator is of order {len(ratio.b) - 1}, higher than that of its recursion, {order}"
    if low == 0:
        return "it has a pole at z = 1, where F would be 0"
    if order == 2 and low < 0:
        return "it has one real pole above z = 1, for which there is no real F"
    return ""


def hazards(ratio: Ratio) -> tuple[str, ...]:
    """Where it is unstable, or is soon when tuned up."""
    if len(ratio.a) != 3:
        return ()
    tuning, damping = _second_values(ratio)[:2]
    limit = highest_tuning(damping)
    values = f"F = {tuning:.4g} and q = {damping:.4g}"
    if damping <= 0 or tuning >= limit:
        return (f"state-variable-delayed with {values} is unstable: it needs Fq > 0 and F^2 + 2 Fq < 4.",)
    if tuning > NEAR * limit:
        return (f"state-variable-delayed has {values}: tuned up with that q it is unstable from F = {limit:.4g} on.",)
    return ()


def highest_tuning(damping: float) -> float:
    """The F at which F^2 + 2 F q is 4, and with it F q below 2."""
    return sqrt(damping * damping + 4) - damping


def size(section: Polynomials) -> Size:
    return Size(7.875, MAIN + 2.25) if len(section.a) == 3 else Size(4.125, MAIN + 0.875)


FORM = Form(
    name="state-variable-delayed",
    summary="two delayed integrators in a loop: cheap low-pass, band-pass and high-pass at low frequencies",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    hazards=hazards,
    size=size,
)
