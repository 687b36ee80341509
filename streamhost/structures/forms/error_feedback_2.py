"""error-feedback-2: direct-1, and what the last two roundings dropped is added to the next sum.

    y[n] = b0 x[n] + b1 x[n-1] + b2 x[n-2] - a1 y[n-1] - a2 y[n-2] - c1 e[n-1] - c2 e[n-2]
    C(z) = 1 + c1 z^-1 + c2 z^-2 = (1 - z^-1)^2

e[n] is what the rounding of y[n] dropped: the sum before minus y[n] after, without what an overflow took away. Each
pole has a zero of C at the end of the circle that it is nearer to: (1 + z^-1)^2 for poles near z = -1, 1 - z^-2 for two
real poles of different sign, one zero for one pole. The rounding is heard through C / A. Drawn for a second-order
section (the coefficient 2 is a shift):

    x ---+---b0--->(+)------------+-------+---> y
         |          ^             e       |
         |          |           z^-1      |
       z^-1        (+)<--- 2 -----+     z^-1
         |          ^             |       |
         +---b1--->(+)<--- -a1 ---|-------+
         |          ^           z^-1      |
       z^-1      - (+)<-----------+     z^-1
         |          ^                     |
         +---b2--->(+)<--- -a2 -----------+

The one sum is added row by row from the last delay up, b, a, then c: b2 x2 - a2 y2 - e2 + b1 x1 - a1 y1 + 2 e1 + b0 x.

Source: Higgins & Munson, "Noise reduction strategies for digital filters", IEEE Trans. ASSP-30 (1982); Dattorro, "The
implementation of recursive digital filters for high-fidelity audio", J. Audio Eng. Soc. 36 (1988).

Counts: M + N + 1 multiplications, M + 2N additions, M + 2N words of memory; a second-order section 5, 6, 6. In fixed
point one rounding a section.

Good at: low frequencies. The noise of a second-order section with both poles near z = 1 comes close to that of a state
of twice the length, without a multiplication more: for poles of radius 0.99 at 1 kHz and 48 kHz it is 1.6 dB above the
least, and direct-1 is 31.7 dB above it.

Fails: poles away from both ends of the circle, where the noise becomes up to 7.8 dB louder, and all of that at high
frequencies.

Arithmetic: fixed point with an accumulator longer than the signal (16x16+40, 24x24+56): what is dropped is its lower
part. In floating point nothing is dropped that could be fed back, and the form is direct-1 with idle work.

Carries: sections of first and second order. A section without recursion is drawn as in direct-1.
"""

from streamhost.diagram.builder import Ref
from streamhost.structures import shaping
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form


def build_section(draft: Draft, x: Ref) -> Ref:
    c = shaping.at_the_ends(draft.ratio, 2)
    return shaping.build(draft, x, [shaping.integer(draft, k, c[k]) for k in range(1, len(c))])


def hazards(ratio: Ratio) -> tuple[str, ...]:
    return shaping.louder(ratio, shaping.at_the_ends(ratio, 2))


FORM = Form(
    name="error-feedback-2",
    summary="direct-1 that adds what the last two roundings dropped: double noise zero at 0 Hz, no multiplication",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=shaping.carries,
    hazards=hazards,
    size=shaping.size,
)
