"""direct-1 with error feedback: what the forms of that family share.

With C(z) = 1 + c1 z^-1 + ... the sum that makes y subtracts c_k times what its own rounding dropped k frames ago. The
rounding is then heard through C / A, and not through 1 / A.
"""

from collections.abc import Callable, Sequence
from fractions import Fraction
from math import log10

from streamhost.diagram.builder import Ref, Signed, minus
from streamhost.diagram.hints import Point
from streamhost.filters import Polynomials
from streamhost.filters.exact import ONE, Polynomial
from streamhost.filters.stability import is_stable
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Size, delays_down
from streamhost.structures.norm import l2_norm

Dropped = Callable[[Ref, Point], Ref | Signed]
"""From e[n-k] and a place to the term - c_k e[n-k]."""

ROWS = (0.0, 2.375, 4.0)
SHAPED = (0.0, 1.75, 3.375)
"""Rows at which b_k and a_k, and at which c_k join the sum."""

X, B, SUM, A, E, Y = 0.0, 0.75, 1.5, 2.25, 3.0, 3.75
RESIDUE, DELAYS, DROPPED = 0.5, (1.25, 3.125), (1.25, 2.875)
MOST_ORDER = 2
LOUDER = 10.0 ** (1 / 20)
"""One decibel, from which it is said."""


def size(section: Polynomials) -> Size:
    return Size(Y, ROWS[delays_down(section)])


def carries(ratio: Ratio) -> str:
    if ratio.order > MOST_ORDER:
        return f"it is of order {ratio.order}, and error feedback is drawn for sections of first and second order"
    return ""


def build(draft: Draft, x: Ref, terms: Sequence[Dropped | None]) -> Ref:
    """The section; `terms` make what e[n-1], e[n-2] add to y, None where they add nothing."""
    b, a = draft.section.b, draft.section.a
    xs = (x, *_line(draft, "x", len(b) - 1, X, DELAYS, x))
    ys = _line(draft, "y", len(a) - 1, Y, DELAYS)
    es = _line(draft, "e", len(terms), E, DROPPED)
    entering: list[Ref | Signed] = []
    rows: list[float] = []
    for k in reversed(range(max(len(b), len(a)))):
        if k < len(b):
            entering.append(draft.b(k, xs[k], at=(B, ROWS[k])))
        if 1 <= k < len(a):
            entering.append(draft.a(k, ys[k - 1], at=(A, ROWS[k])))
        rows += [ROWS[k]] * (len(entering) - len(rows))
        if 1 <= k <= len(terms) and (term := terms[k - 1]) is not None:
            entering.append(term(es[k - 1], (A, SHAPED[k])))
            rows.append(SHAPED[k])
    y = draft.climb("y", entering, column=SUM, rows=rows)
    if ys:
        ys[0].takes(y)
    if es:
        es[0].takes(draft.residue("e", y, at=(E, RESIDUE)))
    return y


def _line(draft: Draft, name: str, length: int, column: float, rows: Sequence[float], source: Ref | None = None) -> list[Ref]:
    delays: list[Ref] = []
    for k in range(length):
        delays.append(draft.delay(f"{name}{k + 1}", delays[-1] if delays else source, at=(column, rows[k]), face="S"))
    return delays


def coefficient(draft: Draft, k: int, value: float) -> Dropped:
    """c_k as a multiplication."""
    return lambda e, at: minus(draft.gain(f"c{k}", value, e, at=at, face="W", part="c"))


def integer(draft: Draft, k: int, c: Fraction) -> Dropped | None:
    """c_k of magnitude 0, 1 or 2 as what it is: nothing, a wire, a shift."""
    if c == 0:
        return None

    def term(e: Ref, at: Point) -> Ref | Signed:
        dropped = draft.shift(f"c{k}", 1, e, at=at, face="W") if abs(c) == 2 else e
        return minus(dropped) if c > 0 else dropped

    return term


def at_the_ends(ratio: Ratio, most: int) -> Polynomial:
    """(1, c1, ...): a zero at z = 1 or z = -1, whichever is nearer, for each pole, the largest first, and `most` at most.

    A pair of poles in the middle counts as nearer to z = 1.
    """
    poles = len(ratio.a) - 1
    first = 1 if poles == 0 or ratio.a[1] <= 0 else -1
    second = first if poles < 2 or ratio.a[2] > 0 else -first
    c = [Fraction(1)]
    for end in (first, second)[:min(poles, most)]:
        c = [here - end * before for here, before in zip([*c, Fraction(0)], [Fraction(0), *c], strict=True)]
    return tuple(c)


def louder(ratio: Ratio, c: Polynomial) -> tuple[str, ...]:
    """A sentence where the noise through C / A is above that through 1 / A."""
    if not is_stable(ratio.a):
        return ()
    change = l2_norm(c, ratio.a) / l2_norm(ONE, ratio.a)
    if change < LOUDER:
        return ()
    sentence = (f"error feedback makes the rounding noise of a section {20 * log10(change):.1f} dB louder than in direct-1: "
                "its poles lie away from the zeros of C(z).")
    return (sentence,)
