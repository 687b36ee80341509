"""A filter as half the sum of two all-passes: which poles go to which, and whether the sum is the filter.

With rev D the coefficients of D turned round and A = D0 D1,

    B / A = c (s0 rev D0 / D0 + s1 rev D1 / D1),   B = c (s0 rev D0 D1 + s1 D0 rev D1),

so that B is symmetric (s0 = s1) or antisymmetric about half the order. Delays count as poles at 0, whose all-pass is
z^-1. Poles that go to the two by turns, along the circle, are tried first: so are those of low-passes and high-passes of
odd order divided (L. Gazsi, IEEE Transactions on Circuits and Systems 32, 1985; P. Vaidyanathan, S. Mitra and Y. Neuvo,
IEEE Transactions on Acoustics, Speech, and Signal Processing 34, 1986). Then all divisions are, where they are few.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache, reduce
from itertools import product as choices
from itertools import zip_longest
from typing import Any

from streamhost.filters.exact import ONE, Polynomial, from_roots, product, stripped, to_mpf
from streamhost.filters.roots import roots
from streamhost.filters.stability import is_stable
from streamhost.structures.division import Ratio
from streamhost.structures.norm import l2_norm

TOLERANCE = Fraction(1, 1 << 33)
"""How far the sum may be from the filter: rms over all frequencies, of its largest gain (-199 dB). And c from 1/2, which
then is no coefficient."""

MOST_DIVISIONS, MOST_DELAYS = 512, 16
BITS = 200
LOOSE = 1e-6
HALF = Fraction(1, 2)

ANGLES = (0.37, 1.31, 2.66, 0.0, 0.83, 1.57, 2.05, 3.141592653589793)
FEW = 3
"""Of these a division must pass first, before it is tried at all points."""

NO_SYMMETRY = (
    "it is not half the sum of two all-passes: its numerator is neither symmetric nor antisymmetric about half the order"
)
NO_DIVISION = (
    "it is not half the sum of two all-passes: no division of its poles among two gives its numerator. Low-passes and "
    "high-passes of odd order are, and notches and band-passes of second order"
)

Poles = tuple[complex, ...]
Sides = tuple[int, ...]


@dataclass(frozen=True)
class Branch:
    """One all-pass: rev D / D for each section's D, (1, d1, d2), or (1, d1) of the last, times z^-delay."""

    sections: tuple[Polynomial, ...]
    delay: int

    @property
    def denominator(self) -> Polynomial:
        return reduce(product, self.sections, ONE)

    @property
    def numerator(self) -> Polynomial:
        return (Fraction(0),) * self.delay + self.denominator[::-1]


@dataclass(frozen=True)
class Halves:
    """c (s0 first + s1 second); signs are +1 or -1, c > 0, and exactly 1/2 where the filter's largest gain is 1."""

    first: Branch
    second: Branch
    signs: tuple[int, int]
    c: Fraction

    @property
    def poles(self) -> Polynomial:
        return product(self.first.denominator, self.second.denominator)

    @property
    def zeros(self) -> Polynomial:
        left = product(self.first.numerator, self.second.denominator)
        right = product(self.second.numerator, self.first.denominator)
        pairs = zip_longest(left, right, fillvalue=Fraction(0))
        return stripped([self.c * (self.signs[0] * x + self.signs[1] * y) for x, y in pairs])


@lru_cache(maxsize=64)
def halves(ratio: Ratio) -> Halves | str:
    """The two all-passes of a filter, or in words why there are none."""
    lead = next((k for k, value in enumerate(ratio.b) if value), None)
    if lead is None:
        return "its numerator is 0"
    order = len(ratio.b) - 1 + lead
    delays = order - (len(ratio.a) - 1)
    if order == delays == 0:
        return "it is a constant, and there is nothing to divide"
    symmetry = _symmetry(ratio.b[lead:])
    if delays < 0 or symmetry == 0:
        return NO_SYMMETRY
    if delays > MOST_DELAYS:
        return f"it has {delays} delays beside its poles, and up to {MOST_DELAYS} are divided among two all-passes"
    if not is_stable(ratio.a):
        return "a pole lies on or outside the unit circle, where an all-pass has none"
    groups = _groups(roots(ratio.a)) if len(ratio.a) > 1 else []
    probes = Probes(ratio, groups, symmetry)
    for sides in _sides(len(groups), delays):
        for k in range(delays + 1):
            if (c := probes.factor(sides, k, delays - k)) is not None:
                return _verified(ratio, _found(groups, sides, (k, delays - k), symmetry, c))
    return NO_DIVISION


def _symmetry(b: Polynomial) -> int:
    """+1, -1, or 0 where the coefficients are near to neither; whether they are near enough is verified later."""
    even, odd = (sum(abs(x - sign * y) for x, y in zip(b, reversed(b), strict=True)) for sign in (1, -1))
    if min(even, odd) > sum(map(abs, b)) / 100:
        return 0
    return 1 if even <= odd else -1


def _groups(poles: Poles) -> list[Poles]:
    """Conjugate pairs and real poles, along the circle from z = 1 to z = -1, of one angle the outer first."""
    groups = [(pole, pole.conjugate()) if pole.imag else (pole,) for pole in poles if pole.imag >= 0]
    return sorted(groups, key=lambda group: _along(group[0]))


def _along(pole: complex) -> tuple[Fraction, Fraction]:
    """What grows with the angle, exactly: -cos |cos|; and what falls with the radius."""
    x, size = Fraction(pole.real), Fraction(pole.real) ** 2 + Fraction(pole.imag) ** 2
    return -x * abs(x) / size, -size


def _sides(groups: int, delays: int) -> Iterator[Sides]:
    """Which branch each group is in, 0 or 1; the first is always in branch 0, since the branches have no order."""
    yield tuple(k % 2 for k in range(groups))
    if groups > 1 and (delays + 1) << (groups - 1) <= MOST_DIVISIONS:
        yield from ((0, *rest) for rest in choices((0, 1), repeat=groups - 1))


def _found(groups: list[Poles], sides: Sides, delays: tuple[int, int], symmetry: int, c: Fraction) -> Halves:
    first, second = (
        Branch(_sections([group for group, side in zip(groups, sides, strict=True) if side == which]), delays[which])
        for which in (0, 1)
    )
    sign = 1 if c > 0 else -1
    return Halves(first, second, (sign, sign * symmetry), HALF if abs(abs(c) - HALF) <= TOLERANCE else abs(c))


def _sections(groups: list[Poles]) -> tuple[Polynomial, ...]:
    """Pairs, then real poles by twos, and at most one alone, last."""
    reals = [group[0] for group in groups if len(group) == 1]
    together = [group for group in groups if len(group) == 2] + [tuple(reals[i : i + 2]) for i in range(0, len(reals), 2)]
    return tuple(map(from_roots, together))


class Probes:
    """Points on the circle at which a division is tried: some that any would do for, and those of the poles."""

    def __init__(self, ratio: Ratio, groups: list[Poles], symmetry: int) -> None:
        import mpmath

        self.symmetry = symmetry
        sections = [from_roots(group) for group in groups]
        with mpmath.workprec(BITS):
            angles = [*map(mpmath.mpf, ANGLES), *(w for section in sections for w in _angles(section))]
            self.points = [mpmath.expj(-w) for w in angles]
            self.wanted = [_value(ratio.b, z) / _value(ratio.a, z) for z in self.points]
            self.passes = [[_value(d[::-1], z) / _value(d, z) for z in self.points] for d in sections]

    def factor(self, sides: Sides, first: int, second: int) -> Fraction | None:
        """c, with a sign, where c times the sum of the branches, with so many delays, is the filter at every point."""
        import mpmath

        with mpmath.workprec(BITS):
            sums: list[Any] = []
            for i, z in enumerate(self.points):
                branches = [z**first, z**second]
                for side, values in zip(sides, self.passes, strict=True):
                    branches[side] *= values[i]
                sums.append(branches[0] + self.symmetry * branches[1])
                if len(sums) == FEW and self._factor(sums) is None:
                    return None
            c = self._factor(sums)
            return None if c is None else Fraction(int(c * (1 << BITS)), 1 << BITS)

    def _factor(self, sums: list[Any]) -> Any:
        import mpmath

        largest = max(range(len(sums)), key=lambda k: abs(sums[k]))
        c = mpmath.re(self.wanted[largest] / sums[largest])
        off = max(abs(h - c * s) for h, s in zip(self.wanted, sums, strict=False))
        return None if off > LOOSE * abs(c) else c


def _angles(section: Polynomial) -> list[Any]:
    """At and beside the angle of a complex pair: a narrow filter is nothing elsewhere."""
    import mpmath

    if len(section) < 3 or section[1] ** 2 >= 4 * section[2]:
        return []
    radius = mpmath.sqrt(to_mpf(section[2]))
    w = mpmath.acos(-to_mpf(section[1]) / (2 * radius))
    return [w, w + 1 - radius]


def _value(polynomial: Polynomial, z: Any) -> Any:
    result: Any = 0
    for coefficient in reversed(polynomial):
        result = result * z + to_mpf(coefficient)
    return result


def _verified(ratio: Ratio, found: Halves) -> Halves | str:
    """The sum, where in exact numbers it is the filter but for the tolerance; else by how much it is not."""
    pairs = zip_longest(product(ratio.b, found.poles), product(found.zeros, ratio.a), fillvalue=Fraction(0))
    difference = stripped([x - y for x, y in pairs])
    off = l2_norm(difference, product(ratio.a, found.poles)) / (2 * float(found.c))
    if off <= TOLERANCE:
        return found
    return (
        f"it is half the sum of two all-passes only to within {off:.1e} of its gain, and {float(TOLERANCE):.1e} is "
        "allowed: its coefficients are rounded too far. Give it as zeros and poles, or as sections"
    )
