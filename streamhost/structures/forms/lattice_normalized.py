"""lattice-normalized: stages that rotate, so that every state has the power of a white input, and a ladder for the zeros.

    f(m-1)[n] = cm f(m)[n] - km g(m-1)[n-1]       m = N ... 1, with f(N) = x, g(0) = f(0) and cm = sqrt(1 - km^2)
    g(m)[n]   = km f(m)[n] + cm g(m-1)[n-1]
    y[n]      = vM g(M)[n] + ... + v1 g(1)[n] + v0 g(0)[n]

drawn for a second-order section:

    x --------*-----[c2>--->(+)--------------*-----[c1>--->(+)----------+
              |              ^ -             |              ^ -         |
            [k2]           [k2]            [k1]           [k1]          |
              v              |               v              |           |
          +--(+)<---<c2]-----*--[z^-1]<--*--(+)<---<c1]-----*--[z^-1]<--*
          |                              |                              |
        [v2]                           [v1]                           [v0]
          |                              v                              v
          +---------------------------->(+)--------------------------->(+)---> y

The km are those of lattice-ladder; the vm are its, divided by cm+1 ... cN. All are computed to hundreds of digits and
rounded once. Seen from the input, the g(m) are orthonormal: for white input each has the power of the input, and no two are
correlated. So v0^2 + ... + vN^2 is the power of the filter's response.

Nodes are evaluated stage by stage from the input, f(m-1) before g(m); each sum as it is written above.

Source: Gray & Markel, A normalized digital filter structure, IEEE Trans. Acoust., Speech, Signal Process. ASSP-23 (1975).

Counts: with M = N 5N + 1 multiplications, 3N additions, N words of memory; a second-order section 11, 6, 2. Of M < N
the last g is not made and N - M taps are not there. The four multiplications of a stage share two coefficients. In
fixed point with M = N 2N + 1 roundings: every f but x, every g but g(0), and y.

Good at: fixed point. It is scaled by nature, and its rounding noise hardly depends on where the poles are: for a low-pass
of Q 0.707 at 48 kHz it is 2.1 dB above that of one rounding of the output at 100 Hz, and 2.3 dB at 1 kHz (direct-1: 52.1
and 22.8 dB). Each stage keeps the energy that it is given, so that no overflow makes it
oscillate, in wrapping words too, and no change of coefficients raises the energy of the states.

Fails: the most multiplications. Scaled is each section for a white input of its own: in a cascade what comes from the
section before is not white. Near z = 1 and -1 the k need long words: 1 - |k| is what decides the frequency.

Arithmetic: as long as the signal; no long state is needed. Coefficients of 24 bits and more at low frequencies.

Carries: any stable recursion, as a section or whole; |k| of 1 and above is refused, since there is no cm. A numerator
longer than the recursion is tapped from further delays. Not a section without recursion: all its k would be 0.
"""

from fractions import Fraction

from streamhost.diagram.builder import Ref, minus
from streamhost.filters.exact import rounded, square_root
from streamhost.filters.stability import is_stable
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form
from streamhost.structures.lattice import Pen, Stage, lattice_of, size_in, why_not

STAGE = Stage(pitch=2.5, low=2.25, backward=0.0, delay=1.375, a_row=4)


def build_section(draft: Draft, x: Ref) -> Ref:
    lattice = lattice_of(draft.ratio)
    reflections = rounded(lattice.reflections)
    cosines = rounded(square_root(1 - k * k) for k in lattice.reflections)
    pen = Pen(draft, STAGE, lattice)
    f, g = x, {}
    for m in range(pen.order, 0, -1):
        place, d = pen.at, pen.delays[m]
        direct = draft.gain(f"c{m}", cosines[m - 1], f, at=place(m, 0.5, 0), part="a")
        back = draft.gain(f"k{m}", reflections[m - 1], d, at=place(m, 1.0, 1.125), face="N", part="a")
        below = f
        f = draft.add(f"f{m - 1}", [direct, minus(back)], at=place(m, 1.0, 0))
        pen.forward(m - 1, f)
        if pen.needs(m):
            ahead = draft.again(back, f"k{m}g", below, at=place(m, 0, 1.125), face="S")
            passed = draft.again(direct, f"c{m}g", d, at=place(m, 0.5, 2.25), face="W")
            g[m] = draft.add(f"g{m}", [ahead, passed], at=place(m, 0, 2.25), face="W")
            pen.backward(m, g[m])
    g[0] = f
    pen.backward(0, f)
    return pen.ladder(ladder_of(lattice.reflections, lattice.ladder), g)


def ladder_of(reflections: tuple[Fraction, ...], ladder: tuple[Fraction, ...]) -> tuple[float, ...]:
    """v_m divided by the product of c_(m+1) ... c_N, the gain of g_m over that of an unnormalized lattice."""
    power, values = Fraction(1), list(ladder)
    for m in reversed(range(len(reflections))):
        power *= 1 - reflections[m] ** 2
        if m < len(values):
            values[m] /= square_root(power)
    return rounded(values)


def carries(ratio: Ratio) -> str:
    if reason := why_not(ratio):
        return reason
    if is_stable(ratio.a):
        return ""
    for m, k in enumerate(lattice_of(ratio).reflections, 1):
        if abs(k) >= 1:
            return f"its reflection coefficient k{m} is {float(k):.6g}, and a normalized stage needs |k| < 1, a stable filter"
    return ""


FORM = Form(
    name="lattice-normalized",
    summary="stages that rotate: every state has the power of a white input, whatever the filter",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    size=size_in(STAGE),
)
