"""lattice-ladder: reflection coefficients in stages of two multipliers, and a ladder of taps for the zeros.

    f(m-1)[n] = f(m)[n] - km g(m-1)[n-1]          m = N ... 1, with f(N) = x and g(0) = f(0)
    g(m)[n]   = km f(m-1)[n] + g(m-1)[n-1]
    y[n]      = vM g(M)[n] + ... + v1 g(1)[n] + v0 g(0)[n]

drawn for a second-order section (* joins, wires cross):

    x ----->(+)----*---------->(+)------*----------------+
             ^ -   |            ^ -     |                |
           [k2]    |          [k1]      |                |
             |     |            |       |                |
             +-----|----+       +-------|----+           |
                   |    |               |    |           |
                 [k2]   |             [k1]   |           |
                   v    |               v    |           |
               +--(+)<--*--[z^-1]<--*--(+)<--*--[z^-1]<--*
               |                    |                    |
             [v2]                 [v1]                 [v0]
               |                    v                    v
               +------------------>(+)----------------->(+)---> y

Of A = A(N) the step-down recursion gives A(m-1) = (A(m) - km z^-m A(m)(1/z)) / (1 - km^2), km being the last
coefficient of A(m). So k is of the sign of the coefficient: A(1) = 1 + k1 z^-1. The other convention, a(m) = -km, is
also in use. The vm follow from B = v0 A(0) + v1 z^-1 A(1)(1/z) + ... + vM z^-M A(M)(1/z), the highest first. All are
computed to hundreds of digits and rounded once. The filter is stable if and only if every |km| < 1.

Nodes are evaluated stage by stage from the input, f(m-1) before g(m); each sum as it is written above.

Source: Gray & Markel, Digital lattice and ladder filter synthesis, IEEE Trans. Audio Electroacoust. AU-21 (1973);
Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6 (where k has the other sign).

Counts: with M = N 3N + 1 multiplications, 3N additions, N words of memory; a second-order section 7, 6, 2. Of M < N
the last g is not made and N - M taps are not there. The two multiplications of a stage share one coefficient. In fixed
point with M = N 2N + 1 roundings: every f but x, every g but g(0), and y.

Good at: whole filters of high order, whose stability is seen from the coefficients and kept under any rounding of them
that leaves every |k| below 1. With scaling l2 the rounding noise of a low-pass of Q 0.707 at 100 Hz and 48 kHz is
33.4 dB above that of one rounding of the output (direct-1: 52.1 dB); at 1 kHz 13.9 dB (22.8 dB).

Fails: f(0) is the input through 1 / A, as w is in direct-2: scale it (scaling l2) or give it integer bits. High-pass
filters at low frequencies: the same filter as a high-pass at 100 Hz has 55.1 dB. Where k1 is near -1, as in all of
these, the roundings of g(1) and of f(0) a frame later are those of the same product, and cancel or add: measured noise is
then up to 2 dB off the prediction, and the verdict on the white model says so.

Arithmetic: floating point, or a long signal throughout: f(1) ... f(N-1) are kept in the word of the signal, so that a
long state alone helps little.

Carries: any recursion whose step-down does not end early (a stage above the first with k of exactly 1 or -1), stable or
not, as a section or whole. A numerator longer than the recursion is tapped from further delays. Not a section without
recursion: all its k would be 0.
"""

from streamhost.diagram.builder import Ref, minus
from streamhost.filters.exact import rounded
from streamhost.structures.form import Draft, Form
from streamhost.structures.lattice import Pen, Stage, lattice_of, size_in, why_not

STAGE = Stage(pitch=2.125, low=2.5, backward=0.75, delay=1.75, a_row=4)


def build_section(draft: Draft, x: Ref) -> Ref:
    lattice = lattice_of(draft.ratio)
    reflections, ladder = rounded(lattice.reflections), rounded(lattice.ladder)
    pen = Pen(draft, STAGE, lattice)
    f, g = x, {}
    for m in range(pen.order, 0, -1):
        back = draft.gain(f"k{m}", reflections[m - 1], pen.delays[m], at=pen.at(m, 0, 0.875), face="N", part="a")
        f = draft.add(f"f{m - 1}", [f, minus(back)], at=pen.at(m, 0, 0))
        pen.forward(m - 1, f)
        if pen.needs(m):
            ahead = draft.again(back, f"k{m}g", f, at=pen.at(m, 0.75, 1.875), face="S")
            g[m] = draft.add(f"g{m}", [ahead, pen.delays[m]], at=pen.at(m, 0.75, 2.5), face="W")
            pen.backward(m, g[m])
    g[0] = f
    pen.backward(0, f)
    return pen.ladder(ladder, g)


FORM = Form(
    name="lattice-ladder",
    summary="reflection coefficients in stages of two multipliers, and a ladder for the zeros",
    begins_with="recursion",
    build_section=build_section,
    docs=__doc__,
    carries=why_not,
    size=size_in(STAGE),
)
