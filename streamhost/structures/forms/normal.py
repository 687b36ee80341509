"""normal: a state space whose matrix is normal: a turn and a shrinking, for a pair of poles sigma +- j omega.

    s1[n+1] =  sigma s1[n] + omega s2[n] + b1 x[n]
    s2[n+1] = -omega s1[n] + sigma s2[n] + b2 x[n]
    y[n]    =  c2 s2[n] + c1 s1[n] + d x[n]

Two real poles p1 and p2 are two states of their own, without omega; one pole is one state. The states are scaled: white input
of power 1 gives each of them the power 1. Drawn for a pair of poles:

    x ---+------------------- d ----------------->(+)---> y
         |     +<-- sigma ---+                     ^
         |     v             |                     |
         +-b1->(+)--->z^-1---+---------- c1 ----->(+)
         |     ^             |                     ^
         |     +<-- omega ---|--+                  |
         |     +<-- omega ---+  |                  |
         |   - v                |                  |
         +-b2->(+)--->z^-1------+------- c2 -------+
               ^                |
               +<-- sigma ------+

Row after row in the order t1, t2, y, each sum as written above. The sum that a state takes is labelled t, its delay s. sigma
and omega are stored once. The form coupled has the same matrix and a power of two for the scale of its states.

Source: C. Barnes and A. Fam, "Minimum norm recursive digital filters that are free of overflow limit cycles", IEEE Trans.
CAS-24 (1977); Jackson, Lindgren & Kim, "Optimal synthesis of second-order state-space structures for digital filters",
IEEE Trans. CAS-26 (1979).

Counts: a second-order section 9, 6, 2; with real poles 7, 4, 2; first order 4, 2, 1. In fixed point one rounding a state,
and one of the output.

Good at: whatever must not oscillate. The matrix shrinks every state by the poles' radius, also with its coefficients rounded:
an overflow dies out whether it wraps or saturates, and with registers
rounded toward zero everything does. Its coefficients move the poles by as much as they move, where
those of direct-1 move poles near each other by many times that. The roundings of the states are heard with half the power
of one for a low-pass of Q 0.707 at any frequency; direct-1's is heard 52 dB louder than it is at 100 Hz and 48 kHz.

Fails: poles that nearly meet (Q near 0.5): the residues grow without limit, and the noise with them. The states are scaled
for white noise, and low steady tones need integer bits: a full-scale constant makes them 14 times full scale for that
low-pass at 100 Hz. With four of 16 bits given to that, its noise there is about that of kingsbury. b, d and omega are small at
low frequencies and need points of their own (point "polynomial" or "coefficient") or more bits.

Arithmetic: fixed point with a state of a few more integer bits (state and operand "Q5.19" with 24 bits); floating point.

Carries: stable sections of first and second order with a recursion and without a double pole.
"""

from streamhost.diagram.builder import Ref, Signed, minus
from streamhost.diagram.hints import Point
from streamhost.structures import states
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form
from streamhost.structures.gramians import StateSpace, heard, least_noise
from streamhost.structures.modal import discriminant
from streamhost.structures.modal import normal as computed

LOUDER = 4.0
"""Times the power of the least, from which the noise is said."""


def build_section(draft: Draft, x: Ref) -> Ref:
    ratio = draft.ratio
    if ratio.order == 0:
        return draft.gain("d", float(ratio.b[0]), x, at=(states.STATE, 0), part="d")
    space = computed(ratio)
    is_pair = ratio.order == 2 and discriminant(ratio) < 0
    return states.draw(draft, x, space, turning(draft, space) if is_pair else apart(draft, space))


def turning(draft: Draft, space: StateSpace) -> states.Entry:
    """[[sigma, omega], [-omega, sigma]], either stored in the first row."""
    stored: dict[bool, Ref] = {}

    def entry(i: int, j: int, s: Ref, at: Point) -> Ref | Signed:
        name = "sigma" if i == j else "omega"
        if i == 0:
            stored[i == j] = draft.gain(name, space.a[i][j], s, at=at, face="W", part="a")
            return stored[i == j]
        product = draft.again(stored[i == j], name, s, at=at, face="W")
        return product if i == j else minus(product)

    return entry


def apart(draft: Draft, space: StateSpace) -> states.Entry:
    """A diagonal of real poles."""
    return lambda i, j, s, at: draft.gain(f"p{i + 1}", space.a[i][i], s, at=at, face="W", part="a") if i == j else None


def carries(ratio: Ratio) -> str:
    if ratio.order > 2:
        return f"it is of order {ratio.order}, and the normal form is one of first and second order"
    if ratio.order == 2 and ratio.is_recursive and discriminant(ratio) == 0:
        return "it has a double pole, which has no normal form"
    return states.is_unfit(ratio)


def hazards(ratio: Ratio) -> tuple[str, ...]:
    if ratio.order == 0:
        return ()
    space = computed(ratio)
    noise, least = heard(space), least_noise(ratio)
    found = states.loud(ratio, space)
    if noise > max(1.0, LOUDER * least):
        sentence = (f"the poles of a section nearly meet, and the roundings of its states are heard with {noise:.3g} times the "
                    f"power of one; in minimum-noise with {least:.3g}.")
        return (*found, sentence)
    return found


FORM = Form(
    name="normal",
    summary="state space with a normal matrix: quiet at low frequencies, no overflow oscillations",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    hazards=hazards,
    size=states.size,
)
