"""Drawing a section as a state space, x[n+1] = A x[n] + B u[n], y[n] = C x[n] + D u[n]: what the forms of that family share."""

from collections.abc import Callable
from math import ceil, log2

from streamhost.diagram.builder import Builder, Ref, Signed
from streamhost.diagram.hints import General, Point
from streamhost.filters import Polynomials
from streamhost.filters.exact import rounded, stripped
from streamhost.filters.roots import roots
from streamhost.filters.stability import is_stable
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Size, delays_down
from streamhost.structures.gramians import StateSpace

Entry = Callable[[int, int, Ref, Point], Ref | Signed | None]
"""From i, j, the state s_j and a place to the term a_ij s_j; None where there is none."""

B, SUM, STATE, C, Y = 0.75, 1.5, 2.375, 3.75, 4.5
FIRST = 1.625
"""The row of the first state, below that of d and that of a11."""

ROWS = (FIRST, 3.875)
COEFFICIENTS = {(0, 0): 0.875, (0, 1): 2.375, (1, 0): 3.125, (1, 1): 4.625}
"""The rows of a_ij with two states."""

MOST_DRAWN = 2
"""States that are drawn one by one; more are drawn as a column of numbers."""

LOUD = 4.0
"""Times full scale, from which a state's size is said."""


def size(section: Polynomials) -> Size:
    states = delays_down(section)
    return Size(Y, COEFFICIENTS[1, 1] if states == 2 else FIRST if states == 1 else 0.0)


def draw(draft: Draft, x: Ref, space: StateSpace, entry: Entry) -> Ref:
    """The section. `entry` makes the terms of A.

    Row after row, each by its states in order and then its input; the output last, from the last state to the first.
    """
    states = range(len(space.b))
    s = [draft.delay(f"s{i + 1}", at=(STATE, row(i))) for i in states]
    draft.trunk(x, (0, 0), (0, row(len(s) - 1)), (0, 0), (SUM, 0))
    for i in states:
        found = [entry(i, j, s[j], (STATE, row_of(i, j))) for j in states]
        terms = [term for term in found if term is not None]
        fed = draft.gain(f"b{i + 1}", space.b[i], x, at=(B, row(i)), part="b")
        s[i].takes(draft.add(f"t{i + 1}", [*terms, fed], at=(SUM, row(i))))
    heard = [draft.gain(f"c{i + 1}", space.c[i], s[i], at=(C, row(i)), part="c") for i in reversed(states)]
    direct = draft.gain("d", space.d, x, at=(STATE, 0), part="d")
    return draft.climb("y", [*heard, direct], column=Y, rows=[*(row(i) for i in reversed(states)), 0.0])


def each(draft: Draft, space: StateSpace) -> Entry:
    """Every entry of A as a coefficient of its own."""
    return lambda i, j, s, at: draft.gain(f"a{i + 1}{j + 1}", space.a[i][j], s, at=at, face="W", part="a")


def row(i: int) -> float:
    return ROWS[i] if i < MOST_DRAWN else ROWS[1] + 1.25 * i


def row_of(i: int, j: int) -> float:
    return COEFFICIENTS.get((i, j), row(i) + 0.125 * j)


def is_unfit(ratio: Ratio) -> str:
    """Why the states of a section cannot be scaled, or "": there is no recursion, or it does not die out."""
    if ratio.order > 0 and not ratio.is_recursive:
        return "it has no recursion"
    if not is_stable(ratio.a):
        return "it has a pole on or outside the unit circle, and its states no power that they could be scaled by"
    return ""


def general(section: Polynomials) -> General | None:
    """The state space as one column of states, for more states than are drawn one by one."""
    states = delays_down(section)
    if states <= MOST_DRAWN:
        return None
    builder = Builder()
    place = builder.place
    x = place(builder.input(), (0.0, 0.0))
    s = place(builder.delay("s"), (3.0, 1.25))
    a = place(builder.gain(s, "A"), (3.0, 2.25), "W")
    t = place(builder.sum(a, place(builder.gain(x, "B"), (1.25, 1.25)), label="t"), (2.125, 1.25))
    s.takes(t)
    c = place(builder.gain(s, "C"), (4.25, 1.25))
    d = place(builder.gain(x, "d"), (3.0, 0.0))
    y = place(builder.sum(c, d, label="y"), (5.0, 0.0))
    place(builder.output(y), (5.875, 0.0))
    return General(builder.build(), f"The wires between B, A and C stand for {states} states, A, B and C for the matrices.")


def loud(ratio: Ratio, space: StateSpace) -> tuple[str, ...]:
    """A sentence where a steady sine makes a state far larger than itself, though white noise of the same power does not."""
    frequency, largest = loudest(ratio, space)
    if largest < LOUD:
        return ()
    what = f"full-scale sine at {frequency:.2g} of the rate" if frequency else "full-scale constant"
    sentence = (f"the states are scaled for white noise, and a {what} into a section makes one of them {largest:.2g} times "
                f"full scale: give state and operand {ceil(log2(largest))} more integer bits, or the input less level.")
    return (sentence,)


def loudest(ratio: Ratio, space: StateSpace) -> tuple[float, float]:
    """At which frequency, as a part of the rate, a sine of amplitude 1 makes a state largest, and how large.

    Looked for at 0, at half the rate and at the angles of the poles.
    """
    import numpy as np

    a, b = np.array(space.a), np.array(space.b)
    angles = sorted({0.0, np.pi, *(abs(float(np.angle(pole))) for pole in roots(rounded(stripped(ratio.a))))})
    found = [float(np.abs(np.linalg.solve(np.exp(1j * w) * np.eye(len(b)) - a, b)).max()) for w in angles]
    largest = max(found)
    return float(angles[found.index(largest)] / (2 * np.pi)), largest
