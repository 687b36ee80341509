"""Which zeros go with which poles in a section.

The pole pair nearest the unit circle takes its nearest zeros, and so on with what is left (Jackson, 1970; Oppenheim &
Schafer, Discrete-Time Signal Processing, ch. 6). A real pole goes with the real pole that is next nearest the circle.

There are as many zeros as poles once roots at z = 0, which change nothing, fill up the smaller number; an odd order
gets one more of both. Such a root is as near or far as any other: in a low-pass of odd order the zero at 0 goes with
the pole pair nearest z = 1, and the real pole takes two of the zeros at z = -1. A pure delay z^-1 is a zero at
infinity: farthest from every pole, it is taken last.

Distances are compared exactly, so that the same roots give the same sections on every machine.
"""

from collections.abc import Callable, Iterable
from fractions import Fraction
from math import inf
from typing import Any

from streamhost.filters import Polynomials, ZerosPoles
from streamhost.filters.exact import conjugate_section, square_root

AT_INFINITY = complex(inf, 0.0)

Pair = tuple[complex, complex]


def nearest_pairs(solved: ZerosPoles) -> tuple[Polynomials, ...]:
    """Sections with monic numerators, those nearest the unit circle first; one constant section where no root is.

    Each coefficient is exact in the float64 parts of the roots, and rounded once.
    """
    zeros, poles = _filled(solved)
    sections = []
    while poles:
        pole_pair = _take_pair(poles, from_circle)
        zero_pair = _take_pair(zeros, _distance_to(pole_pair[0]))
        sections.append(_section(zero_pair, pole_pair))
    return tuple(sections) or (Polynomials((1.0,), (1.0,)),)


def from_circle(pole: complex) -> Fraction:
    """The distance | 1 - |p| | of a pole from the unit circle."""
    return abs(1 - square_root(Fraction(pole.real) ** 2 + Fraction(pole.imag) ** 2))


def _filled(solved: ZerosPoles) -> tuple[list[complex], list[complex]]:
    """Equally many zeros and poles, an even number; of each conjugate pair only the upper root."""
    zeros = [*solved.zeros, *[AT_INFINITY] * solved.delay]
    poles = list(solved.poles)
    count = max(len(zeros), len(poles))
    count += count % 2
    return _uppers(zeros, count), _uppers(poles, count)


def _uppers(roots: list[complex], count: int) -> list[complex]:
    """Filled up to `count` with roots at 0; complex ones first, each kind from left to right."""
    filled = [*roots, *[0j] * (count - len(roots))]
    return sorted((root for root in filled if root.imag >= 0), key=lambda r: (r.imag == 0, r.real, r.imag))


def _take_pair(roots: list[complex], distance: Callable[[complex], Any]) -> Pair:
    """Take the nearest root out, with its conjugate, or with the nearest other real root."""
    first = min(roots, key=distance)
    roots.remove(first)
    if first.imag != 0:
        return first, first.conjugate()
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


def _section(zeros: Iterable[complex], poles: Pair) -> Polynomials:
    finite = [zero for zero in zeros if zero != AT_INFINITY]
    section = conjugate_section(finite, poles, 1.0)
    return Polynomials((0.0,) * (2 - len(finite)) + section.b, section.a)
