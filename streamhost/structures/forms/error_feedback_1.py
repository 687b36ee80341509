"""error-feedback-1: direct-1, and what the last rounding dropped is added to the next sum.

    y[n] = b0 x[n] + b1 x[n-1] + b2 x[n-2] - a1 y[n-1] - a2 y[n-2] - c1 e[n-1],   C(z) = 1 + c1 z^-1 = 1 - z^-1

e[n] is what the rounding of y[n] dropped: the sum before minus y[n] after, without what an overflow took away. Where
the poles are nearer to z = -1, C(z) = 1 + z^-1, which is another program. The rounding is heard through C / A. Drawn for
a second-order section:

    x ---+---b0--->(+)------------+-------+---> y
         |          ^             e       |
         |          |           z^-1      |
       z^-1        (+)<-----------+     z^-1
         |          ^                     |
         +---b1--->(+)<--- -a1 -----------+
         |          ^                     |
       z^-1         |                   z^-1
         |          |                     |
         +---b2--->(+)<--- -a2 -----------+

The one sum is added row by row from the last delay up, b, a, then c: b2 x2 - a2 y2 + b1 x1 - a1 y1 + e1 + b0 x.

Source: Abu-El-Haija & Peterson, "An approach to eliminate roundoff errors in digital filters", IEEE Trans. ASSP-27
(1979); Higgins & Munson, "Noise reduction strategies for digital filters", IEEE Trans. ASSP-30 (1982); Dattorro, "The
implementation of recursive digital filters for high-fidelity audio", J. Audio Eng. Soc. 36 (1988).

Counts: M + N + 1 multiplications, M + N + 1 additions, M + N + 1 words of memory; a second-order section 5, 5, 5. In
fixed point one rounding a section.

Good at: poles near z = 1, at the price of one addition and one word. A second-order section's noise falls by
2 (1 - rho), rho = -a1 / (1 + a2): by 17.6 dB for poles of radius 0.99 at 1 kHz and 48 kHz. Everything else is as in
direct-1.

Fails: poles away from both ends of the circle, where the noise becomes up to 3 dB louder. One pole of two is left to
the noise; error-feedback-2 takes both.

Arithmetic: fixed point with an accumulator longer than the signal (16x16+40, 24x24+56): what is dropped is its lower
part. In floating point nothing is dropped that could be fed back, and the form is direct-1 with idle work.

Carries: sections of first and second order. A section without recursion is drawn as in direct-1.
"""

from streamhost.diagram.builder import Ref
from streamhost.structures import shaping
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form


def build_section(draft: Draft, x: Ref) -> Ref:
    c = shaping.at_the_ends(draft.ratio, 1)
    return shaping.build(draft, x, [shaping.integer(draft, k, c[k]) for k in range(1, len(c))])


def hazards(ratio: Ratio) -> tuple[str, ...]:
    return shaping.louder(ratio, shaping.at_the_ends(ratio, 1))


FORM = Form(
    name="error-feedback-1",
    summary="direct-1 that adds what the last rounding dropped: noise zero at 0 Hz, no multiplication",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=shaping.carries,
    hazards=hazards,
    size=shaping.size,
)
