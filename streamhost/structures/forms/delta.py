"""delta: transposed-2 with every delay replaced by a summing register: the delta operator instead of z^-1.

    delta = (z - 1) / D,   D = 2^-k

    y[n]    = beta0 x[n] + s1[n]
    ui[n]   = betai x[n] - alphai y[n] + s(i+1)[n],   i = 1 ... N, no s beyond sN
    si[n+1] = si[n] + D ui[n]

N is the order, alpha and beta are the coefficients of the same filter in powers of delta^-1:
B / A = (beta0 + beta1 delta^-1 + ...) / (1 + alpha1 delta^-1 + ...), of second order alpha1 = (2 + a1) / D and
alpha2 = (1 + a1 + a2) / D^2. D is the smallest power of two, at most 1, for which no alpha is larger than 1, if there is one;
another k is another program.
Drawn for a second-order section:

    x ---+---beta0--->(+)------------------+---> y
         |             ^                   |
         |        s1   +-----+             |
         |           z^-1    |             |
         |             ^     |             |
         |            (+)<---+             |
         |             ^                   |
         |            2^-k                 |
         |             ^                   |
         +---beta1--->(+)<--- -alpha1 -----+   u1
         |             ^                   |
         |        s2   +-----+             |
         |           z^-1    |             |
         |             ^     |             |
         |            (+)<---+             |
         |             ^                   |
         |            2^-k                 |
         |             ^                   |
         +---beta2--->(+)<--- -alpha2 -----+   u2

Nodes are evaluated in the order y, u1, t1, u2, t2, ...; each sum as it is written above, si[n] first. The sum that a register
takes is labelled ti, its delay si. Without a shift (D = 1) the sum ui goes straight into ti.

Source: R. Middleton and G. Goodwin, "Improved finite word length characteristics in digital control using delta operators",
IEEE Trans. AC-31 (1986); Kauraniemi, Laakso, Hartimo & Ovaska, "Delta operator realizations of direct-form IIR filters",
IEEE Trans. CAS-II 45 (1998).

Counts: 2N + 1 multiplications, 3N additions, N words of memory; a second-order section 5, 6, 2. In fixed point one
rounding a register, and one of y.

Good at: poles near z = 1, where a1 and a2 are near -2 and 1 and all that matters is in their last bits: alpha and beta say
it with their first. At low frequencies the registers are as large as the output, and the noise grows by 3 dB an octave as
the frequency falls, where that of transposed-2 grows by 9: it is 34 dB below it for a low-pass of Q 0.707 at 100 Hz and
48 kHz. In float32 that low-pass at 20 Hz had noise of -170 dBFS on white noise of -10 dBFS peak, transposed-2 of -114.

Fails: poles away from z = 1, most of all near z = -1: there it is louder than transposed-2 and costs more. The products are
shifted right before they are added, so that the accumulator needs k more fraction bits.

Arithmetic: float32, and fixed point with the full accumulator.

Carries: any recursive filter up to order 12, as a section or whole.
"""

from fractions import Fraction
from math import comb

from streamhost.diagram.builder import Builder, Ref, Signed, minus
from streamhost.diagram.hints import General
from streamhost.filters import Polynomials
from streamhost.filters.exact import Polynomial, rounded
from streamhost.structures.division import Ratio, ratio_of
from streamhost.structures.form import Draft, Form, Size, delays_down

MOST_ORDER = 12
MOST_DRAWN = 4
PITCH = 3.0
BETA, SUM, ALPHA, Y = 0.75, 1.5, 2.625, 3.375
SHIFT, ADDER, REGISTER = 0.75, 1.25, 2.125
"""Rows above the sum ui."""

MOST_SHIFT = 40
PLAIN = ("the poles of a section lie so far from z = 1 that the delta operator is a plain sum (D = 1): it gains nothing "
         "over transposed-2 there.")


def build_section(draft: Draft, x: Ref) -> Ref:
    ratio = draft.ratio
    k = halvings(ratio)
    beta, alpha = (rounded(in_delta(polynomial, ratio.order, k)) for polynomial in (ratio.b, ratio.a))
    return build(draft, x, beta, alpha, k)


def build(draft: Draft, x: Ref, beta: tuple[float, ...], alpha: tuple[float, ...], k: int) -> Ref:
    """A section of these coefficients, as many of either, with shifts by -k where k is not 0."""
    order = len(beta) - 1
    s = [draft.delay(named(draft, "s", i), at=(SUM, i * PITCH - REGISTER), face="N") for i in range(1, order + 1)]
    product = draft.gain(named(draft, "beta", 0), beta[0], x, at=(BETA, 0), part="b")
    y = draft.add("y", [product, *s[:1]], at=(SUM, 0))
    draft.trunk(x, (0, 0), (0, PITCH * order))
    draft.trunk(y, (Y, 0), (Y, PITCH * order))
    for i in range(1, order + 1):
        row = i * PITCH
        fed = draft.gain(named(draft, "beta", i), beta[i], x, at=(BETA, row), part="b")
        back = draft.gain(named(draft, "alpha", i), alpha[i], y, at=(ALPHA, row), face="W", part="a", feedback=True)
        terms: list[Ref | Signed] = [fed, minus(back), *s[i:i + 1]]
        u = draft.add(named(draft, "u", i), terms, at=(SUM, row), face="N")
        if k:
            u = draft.shift(named(draft, "D", i), -k, u, at=(SUM, row - SHIFT), face="N")
        s[i - 1].takes(draft.add(named(draft, "t", i), [s[i - 1], u], at=(SUM, row - ADDER), face="N"))
    return y


def named(draft: Draft, letter: str, i: int) -> str:
    return f"{letter}{draft.numbers[i] if draft.numbers else i}"


def in_delta(ascending: Polynomial, order: int, k: int) -> Polynomial:
    """The coefficients of delta^-i, D = 2^-k, of a polynomial in z^-1: that of z^order P, expanded about z = 1, over D^i."""
    descending = [*ascending, *[Fraction(0)] * (order + 1 - len(ascending))]
    return tuple(
        sum((descending[j] * comb(order - j, order - i) for j in range(i + 1)), Fraction(0)) * 2 ** (k * i)
        for i in range(order + 1)
    )


def halvings(ratio: Ratio) -> int:
    """The k of the smallest D = 2^-k, at most 1, for which no alpha is larger than 1; 0 if there is none."""
    alpha = in_delta(ratio.a, ratio.order, 0)
    k = 0
    while k < MOST_SHIFT and all(abs(value) * 2 ** ((k + 1) * i) <= 1 for i, value in enumerate(alpha) if i):
        k += 1
    return k if any(alpha[1:]) else 0


def carries(ratio: Ratio) -> str:
    if ratio.order > MOST_ORDER:
        return f"it is of order {ratio.order}, and the delta form is drawn up to order {MOST_ORDER}"
    return "it has no recursion" if ratio.order and not ratio.is_recursive else ""


def hazards(ratio: Ratio) -> tuple[str, ...]:
    if ratio.order and halvings(ratio) == 0:
        return (PLAIN,)
    return ()


def size(section: Polynomials) -> Size:
    return Size(Y, PITCH * delays_down(section))


def general(section: Polynomials) -> General | None:
    """One row that stands for all between the first and the last."""
    order = delays_down(section)
    if order <= MOST_DRAWN:
        return None
    builder = Builder()
    x = builder.place(builder.input(), (0.0, 0.0))
    draft = Draft(builder, section, 0, "", (0.875, 0.0), ("0", "_k", "_N"))
    y = build(draft, x, (1.0,) * 3, (1.0,) * 3, halvings(ratio_of(section)))
    builder.place(builder.output(y), (0.875 + Y + 0.875, 0.0))
    return General(builder.build(), f"The row of k stands for all rows k = 1 to {order - 1}; N = {order}.")


FORM = Form(
    name="delta",
    summary="the delta operator: summing registers instead of delays, for poles near z = 1",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    hazards=hazards,
    size=size,
    general=general,
)
