"""minimum-noise: the state space whose roundings are heard least, of a section or of a whole filter.

    si[n+1] = ai1 s1[n] + ... + aiN sN[n] + bi x[n],   i = 1 ... N
    y[n]    = c1 s1[n] + ... + cN sN[n] + d x[n]

The states are scaled: white input of power 1 gives each of them the power 1; and among all such state spaces this one is
that in which one rounding of each is heard with the least power, (mu_1 + ... + mu_N)^2 / N of the second-order modes
mu_i. Drawn for a second-order section:

    x ---+------------------ d ----------------->(+)---> y
         |     +<--- a11 ---+                     ^
         |     v            |                     |
         +-b1->(+)--->z^-1--+---------- c1 ----->(+)
         |     ^            |                     ^
         |     +<--- a12 ---|--+                  |
         |     +<--- a21 ---+  |                  |
         |     v               |                  |
         +-b2->(+)--->z^-1-----+------- c2 --------+
               ^               |
               +<--- a22 ------+

More than two states are drawn as one column of states. Row after row in the order t1, ..., tN, y, each sum as written
above, but y from the last state up: cN sN + ... + c1 s1 + d x. The sum that a state takes is labelled t, its delay s.

Source: C. Mullis and R. Roberts, "Synthesis of minimum roundoff noise fixed point digital filters", IEEE Trans. CAS-23
(1976); S. Hwang, "Minimum uncorrelated unit noise in state-space digital filtering", IEEE Trans. ASSP-25 (1977); Jackson,
Lindgren & Kim, IEEE Trans. CAS-26 (1979).

Counts: (N + 1)^2 multiplications, N (N + 1) additions, N words of memory; a second-order section 9, 6, 2. In fixed point
one rounding a state, and one of the output.

Good at: the least noise of all state spaces of that scaling, at any frequency: for a low-pass of Q 0.707 the roundings of
the states are heard with 3/8 of the power of one; direct-1's is heard 52 dB louder than it is at 100 Hz and 48 kHz. A
whole filter has no registers between sections.

Fails: it costs N^2 multiplications. The states are scaled for white noise, and low steady tones need integer bits: a
full-scale constant makes them 15 times full scale for that low-pass at 100 Hz. With four of 16 bits given to that, its
noise there is about that of kingsbury. Some of b, c and d are small at low frequencies and need points of their own (point
"coefficient") or more bits.

Arithmetic: fixed point with a state of a few more integer bits (state and operand "Q5.19" with 24 bits); floating point.

Carries: stable sections and filters with a recursion, up to order 12. Modes below 2^-16 of the largest (poles that zeros
nearly cancel) are taken as that.
"""

from streamhost.diagram.builder import Ref
from streamhost.structures import states
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form
from streamhost.structures.gramians import quietest

MOST_ORDER = 12


def build_section(draft: Draft, x: Ref) -> Ref:
    ratio = draft.ratio
    if ratio.order == 0:
        return draft.gain("d", float(ratio.b[0]), x, at=(states.STATE, 0), part="d")
    space = quietest(ratio)
    return states.draw(draft, x, space, states.each(draft, space))


def carries(ratio: Ratio) -> str:
    if ratio.order > MOST_ORDER:
        return f"it is of order {ratio.order}, whose matrix would have {ratio.order**2} coefficients; {MOST_ORDER} is the most"
    return states.is_unfit(ratio)


def hazards(ratio: Ratio) -> tuple[str, ...]:
    return states.loud(ratio, quietest(ratio)) if ratio.order else ()


FORM = Form(
    name="minimum-noise",
    summary="the state space whose roundings are heard least",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    hazards=hazards,
    size=states.size,
    general=states.general,
)
