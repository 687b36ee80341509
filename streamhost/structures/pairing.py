"""Which zeros go with which poles in a section.

The pole pair nearest the unit circle takes its nearest zeros, and so on with what is left (Jackson, 1970; Oppenheim &
Schafer, Discrete-Time Signal Processing, ch. 6). A real pole goes with the real pole that is next nearest the circle.

There are as many zeros as poles once roots at z = 0, which change nothing, fill up the smaller number. Such a root is as
near or far as any other. A pure delay z^-1 is a zero at infinity: farthest from every pole, it is taken last. Of an odd
number, the real pole farthest from the circle is left alone: a first-order section, for which a real zero is kept.

Distances are compared exactly, so that the same roots give the same sections on every machine.
"""

from collections.abc import Callable
from fractions import Fraction
from math import inf
from typing import Any

from streamhost.filters import Polynomials, ZerosPoles
from streamhost.filters.exact import conjugate_section, square_root

AT_INFINITY = complex(inf, 0.0)

Group = tuple[complex, ...]


def nearest_pairs(solved: ZerosPoles) -> tuple[Polynomials, ...]:
    """Sections with monic numerators, those nearest the unit circle first; one constant section where no root is.

    Each coefficient is exact in the float64 parts of the roots, and rounded once.
    """
    zeros, poles = _filled(solved)
    alone = _farthest_real(poles) if _is_odd(poles) else None
    sections = []
    while poles:
        pole_group = _take(poles, from_circle, alone=min(poles, key=from_circle) == alone)
        alone = None if pole_group == (alone,) else alone
        distance = _distance_to(pole_group[0])
        zero_group = _take(zeros, distance, alone=len(pole_group) == 1, spared=_is_odd(zeros))
        sections.append(_section(zero_group, pole_group))
    return tuple(sections) or (Polynomials((1.0,), (1.0,)),)


def from_circle(pole: complex) -> Fraction:
    """The distance | 1 - |p| | of a pole from the unit circle."""
    return abs(1 - square_root(Fraction(pole.real) ** 2 + Fraction(pole.imag) ** 2))


def _filled(solved: ZerosPoles) -> tuple[list[complex], list[complex]]:
    """Equally many zeros and poles; of each conjugate pair only the upper root."""
    zeros = [*solved.zeros, *[AT_INFINITY] * solved.delay]
    count = max(len(zeros), len(solved.poles))
    return _uppers(zeros, count), _uppers(list(solved.poles), count)


def _uppers(roots: list[complex], count: int) -> list[complex]:
    """Filled up to `count` with roots at 0; complex ones first, each kind from left to right."""
    filled = [*roots, *[0j] * (count - len(roots))]
    return sorted((root for root in filled if root.imag >= 0), key=lambda r: (r.imag == 0, r.real, r.imag))


def _is_odd(roots: list[complex]) -> bool:
    return sum(root.imag == 0 for root in roots) % 2 == 1


def _farthest_real(poles: list[complex]) -> complex:
    return max((pole for pole in poles if pole.imag == 0), key=from_circle)


def _take(roots: list[complex], distance: Callable[[complex], Any], *, alone: bool, spared: bool = False) -> Group:
    """Take the nearest root out: with its conjugate, with the nearest other real root, or a real one alone.

    `spared`: there is an odd number of real roots, one of which a first-order section still to come must find.
    """
    reals = [root for root in roots if root.imag == 0]
    too_few = spared and len(reals) == 1 and len(roots) > 1
    candidates = reals if alone and reals else [root for root in roots if not (too_few and root.imag == 0)]
    first = min(candidates, key=distance)
    roots.remove(first)
    if first.imag != 0:
        return first, first.conjugate()
    if alone:
        return (first,)
    second = min((root for root in roots if root.imag == 0), key=distance)
    roots.remove(second)
    return first, second


def _distance_to(pole: complex) -> Callable[[complex], tuple[bool, Fraction]]:
    """Distances from the pole, squared; infinite ones come after all others."""

    def distance(zero: complex) -> tuple[bool, Fraction]:
        if zero == AT_INFINITY:
            return True, Fraction(0)
        real, imaginary = Fraction(zero.real) - Fraction(pole.real), Fraction(zero.imag) - Fraction(pole.imag)
        return False, real * real + imaginary * imaginary

    return distance


def _section(zeros: Group, poles: Group) -> Polynomials:
    finite = [zero for zero in zeros if zero != AT_INFINITY]
    section = conjugate_section(finite, poles, 1.0)
    return Polynomials((0.0,) * (len(zeros) - len(finite)) + section.b, section.a)
