"""lattice-one-multiplier: a lattice with one multiplication a stage, and a ladder of taps for the zeros.

    u(m)[n]   = f(m)[n] - em g(m-1)[n-1]          m = N ... 1, with f(N) = 2^-s x and g(0) = f(0), em = 1 or -1
    f(m-1)[n] = f(m)[n] + em km u(m)[n]
    g(m)[n]   = g(m-1)[n-1] + km u(m)[n]
    y[n]      = vM g(M)[n] + ... + v1 g(1)[n] + v0 g(0)[n]

drawn for a second-order section with e2 = -1 and e1 = -1 (* joins, wires cross):

    x ------[2^-1>---*---------->(+)-----*-------------->(+)---------------+
                     v            ^ -    v                ^ -              |
                    (+)----[k2>---*     (+)--------[k1>---*                |
                     ^            |      ^                |                |
                     +------------|----+ +----------------|----+           |
                                  v    |                  v    |           |
                       +---------(+)<--*--[z^-1]<--*-----(+)<--*--[z^-1]<--*
                       |                           |                       |
                     [v2]                        [v1]                    [v0]
                       |                           v                       v
                       +------------------------->(+)-------------------->(+)---> y

The km are those of lattice-ladder, whose f(m-1) and g(m-1) these are, times (1 + em km) for each stage from N down to
m; the vm are divided by the same and multiplied by 2^s. The signs decide how large every node is. They are chosen from
the largest |k| outwards so that no node's power exceeds the largest one's and none is lower than need be; of the two
ways to sign the largest one, that with the smaller largest |v|. 2^-s is the least power of two for which no node's power
exceeds that of a white input. All to hundreds of digits, rounded once. Other signs or another s are another program.

Nodes are evaluated stage by stage from the input, u, f, g; each sum as it is written above.

Source: Gray & Markel, Digital lattice and ladder filter synthesis, IEEE Trans. Audio Electroacoust. AU-21 (1973). The
rule for the signs is our own, after their scaling of the nodes.

Counts: with M = N 2N + 1 multiplications, 4N additions, N words of memory; a second-order section 5, 8, 2. Of M < N
the last g is not made and N - M taps are not there. In fixed point with M = N 2N + 1 roundings: every g but g(0), every
u but u(N), f(0) and y; one more, of the first operand, where s > 0.

Good at: the fewest multiplications of the lattices, with the same coefficients k, and stability seen from them. Roundings
of k keep the all-pass from input to g(N) an exact all-pass.

Fails: the powers of the nodes lie far apart at low frequencies, whatever the signs: its rounding noise for a low-pass of
Q 0.707 at 100 Hz and 48 kHz is 40.1 dB above that of one rounding of the output (lattice-ladder with scaling l2: 33.4,
direct-1: 52.1 dB), at 1 kHz 23.6 dB (13.9 and 22.8 dB). A u is a difference or a sum of two nodes and can clip where
neither does.

Arithmetic: floating point, or 24 bits and more.

Carries: any recursion whose step-down does not end early (a stage above the first with k of exactly 1 or -1), stable or
not, as a section or whole; an unstable one is not scaled. A numerator longer than the recursion is tapped from further
delays. Not a section without recursion: all its k would be 0.
"""

from dataclasses import dataclass
from fractions import Fraction
from math import prod

from streamhost.diagram.builder import Ref, minus
from streamhost.filters.exact import Polynomial, rounded
from streamhost.structures.form import Draft, Form
from streamhost.structures.lattice import Lattice, Pen, Stage, lattice_of, size_in, why_not

STAGE = Stage(pitch=2.125, low=2.5, backward=1.375, delay=2.375, a_row=4, margin=0.75)


def build_section(draft: Draft, x: Ref) -> Ref:
    lattice = lattice_of(draft.ratio)
    reflections, plan = rounded(lattice.reflections), plan_of(lattice)
    pen = Pen(draft, STAGE, lattice)
    f = draft.shift("scale", -plan.shift, x, at=(0.125, 0)) if plan.shift else x
    g: dict[int, Ref] = {}
    for m in range(pen.order, 0, -1):
        place, d, is_difference = pen.at, pen.delays[m], plan.signs[m - 1] > 0
        u = draft.add(f"u{m}", [f, minus(d) if is_difference else d], at=place(m, 0, 1.25))
        t = draft.gain(f"k{m}", reflections[m - 1], u, at=place(m, 0.875, 1.25), part="a")
        f = draft.add(f"f{m - 1}", [f, t if is_difference else minus(t)], at=place(m, 1.375, 0))
        pen.forward(m - 1, f)
        if pen.needs(m):
            g[m] = draft.add(f"g{m}", [d, t], at=place(m, 1.375, 2.5), face="W")
            pen.backward(m, g[m])
    g[0] = f
    pen.backward(0, f)
    return pen.ladder(rounded(plan.ladder), g)


@dataclass(frozen=True)
class Plan:
    """The signs e_1 ... e_N, the s of the 2^-s in front, and the ladder v_0 ... v_M that goes with them."""

    signs: tuple[int, ...]
    shift: int
    ladder: Polynomial


def plan_of(lattice: Lattice) -> Plan:
    """Of the two ways to sign the largest reflection coefficient, the one with the smaller ladder coefficients."""
    ways = [plan_with(lattice, rises) for rises in (True, False)] if steps(lattice)[largest(lattice)] else []
    return min(ways, key=lambda plan: max(map(abs, plan.ladder)), default=plan_with(lattice, True))


def steps(lattice: Lattice) -> list[Fraction]:
    """By how much the power falls from one side of each stage to the other, on the side that its sign decides."""
    return [abs(1 - abs(k)) / (1 + abs(k)) for k in lattice.reflections]


def largest(lattice: Lattice) -> int:
    """The place of the largest step."""
    found = steps(lattice)
    return found.index(min(found))


def plan_with(lattice: Lattice, rises: bool) -> Plan:
    """Signs from the largest step outwards: no node's power above the largest one's, and none lower than need be.

    `rises`: whether at that step the power is higher behind the stage, seen from the input.
    """
    found, start = steps(lattice), largest(lattice)
    rising = [rises] * lattice.stages
    level = found[start] if rises else Fraction(1)
    for i in range(start + 1, lattice.stages):
        rising[i] = level > found[i]
        level = level * found[i] if rising[i] else level / found[i]
    front = level
    level = Fraction(1) if rises else found[start]
    for i in range(start - 1, -1, -1):
        rising[i] = level <= found[i]
        level = level / found[i] if rising[i] else level * found[i]
    signs = tuple(1 if up == (k >= 0) else -1 for up, k in zip(rising, lattice.reflections, strict=True))
    return Plan(signs, *scaled(lattice, signs, front))


def scaled(lattice: Lattice, signs: tuple[int, ...], front: Fraction) -> tuple[int, Polynomial]:
    """The shift that leaves the largest node the power of the input at most, and the ladder behind it.

    `front` is the power at the input where the largest is 1. An unstable filter has no powers, and no shift.
    """
    shift = 0
    if all(abs(k) < 1 for k in lattice.reflections):
        while 4**shift * front < 1:
            shift += 1
    gains = [prod(1 + sign * k for sign, k in zip(signs[m:], lattice.reflections[m:], strict=True))
             for m in range(len(lattice.ladder))]
    return shift, tuple(2**shift * v / gain for v, gain in zip(lattice.ladder, gains, strict=True))


FORM = Form(
    name="lattice-one-multiplier",
    summary="a lattice with one multiplier a stage, and a ladder for the zeros",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=why_not,
    size=size_in(STAGE),
)
