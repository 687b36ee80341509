"""The order of sections with the least predicted noise.

Each section is taken to make one white error where its recursion is rounded. In forms that begin with the numerator that
is 1 / A_k and all later sections; in forms that begin with the recursion the error passes the section and all later ones,
and so does that of the register before it. The later a section, the fewer sections filter its error; what scaling does to
the levels weighs it. (Jackson, 1970; Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6.)

What a section contributes depends on which sections stand before it and not on their order, so that the least of all
orders of up to ten sections is found exactly, set by set. Of more, two sections are exchanged, from `outward` and from
`inward` on, as long as an exchange helps; the better end is taken.
"""

from collections.abc import Callable
from functools import cache
from itertools import combinations

from streamhost.structures.division import Sections
from streamhost.structures.form import Half
from streamhost.structures.levels import Levels
from streamhost.structures.quadrature import Samples, sampled

MOST_EXACT = 10
BETTER = 1.0 - 1e-9
"""An order is taken for another only where it is better by more than the powers' error."""

Order = tuple[int, ...]
Share = Callable[[frozenset[int], int], float]
"""What section k adds to the noise power behind a set of sections."""


def quietest(sections: Sections, gain: float, scaling: str, begins_with: Half) -> Order:
    """The order, as places in `sections`, which are trimmed, stable, and in the order `outward`.

    With a scaling by norms sections have monic numerators and `gain` is what was taken out of them; else they stand as
    they are, and it is 1.
    """
    samples, every = sampled(sections), frozenset(range(len(sections)))
    share = cache(shares(samples, Levels(sections, gain, samples, scaling, begins_with), begins_with, every))
    if len(sections) <= MOST_EXACT:
        return _least(every, share)
    outward = tuple(range(len(sections)))
    ends = [_exchanged(start, share) for start in (outward, outward[::-1])]
    return ends[0] if total(ends[0], share) <= total(ends[1], share) else ends[1]


def shares(samples: Samples, levels: Levels, begins_with: Half, every: frozenset[int]) -> Share:
    """The noise power that a section adds, of one white error of power 1 at each rounding."""

    def share(before: frozenset[int], k: int) -> float:
        after = samples.whole[sorted(every - before - {k})].prod(axis=0)
        own = samples.recursion[k] if begins_with == "numerator" else 2.0 * samples.whole[k]
        return samples.power(own * after) * levels.to_output(before, k) ** 2

    return share


def total(order: Order, share: Share) -> float:
    return sum(share(frozenset(order[:place]), k) for place, k in enumerate(order))


def _least(every: frozenset[int], share: Share) -> Order:
    best: dict[frozenset[int], tuple[float, Order]] = {frozenset(): (0.0, ())}
    for size in range(1, len(every) + 1):
        for chosen in map(frozenset, combinations(sorted(every), size)):
            least: tuple[float, Order] | None = None
            for k in sorted(chosen):
                power, order = best[chosen - {k}]
                power += share(chosen - {k}, k)
                if least is None or power < least[0] * BETTER:
                    least = power, (*order, k)
            assert least is not None, "a set has members"
            best[chosen] = least
    return best[every][1]


def _exchanged(order: Order, share: Share) -> Order:
    least = total(order, share)
    while True:
        for i, j in combinations(range(len(order)), 2):
            other = list(order)
            other[i], other[j] = other[j], other[i]
            power = total(tuple(other), share)
            if power < least * BETTER:
                order, least = tuple(other), power
                break
        else:
            return order
