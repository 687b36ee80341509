"""Which zeros go with which poles in a section.

The pole pair nearest the unit circle takes its nearest zeros, and so on with what is left (Jackson, 1970; Oppenheim &
Schafer, Discrete-Time Signal Processing, ch. 6). A real pole goes with the real pole that is next nearest the circle.

There are as many zeros as poles once roots at z = 0, which change nothing, fill up the smaller number; an odd order
gets one more of both. A pure delay z^-1 is a zero at infinity: farthest from every pole, it is taken last.

Distances are compared exactly, so that the same roots give the same sections on every machine.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction
from math import inf

from streamhost.filters import Polynomials, ZerosPoles
from streamhost.filters.exact import conjugate_section, square_root

AT_INFINITY = complex(inf, 0.0)


def nearest_pairs(solved: ZerosPoles) -> tuple[Polynomials, ...]:
    """Sections with monic numerators, those nearest the unit circle first; one constant section where no root is.

    Each coefficient is exact in the float64 parts of the roots, and rounded once.
    """
    zeros, poles = _filled(solved)
    poles = sorted(poles, key=from_circle)
    sections = []
    while poles:
        pole = poles.pop(0)
        pole_pair = _pair(pole, poles, poles)
        by_distance = sorted(zeros, key=lambda zero: _distance(zero, pole))
        zero_pair = _pair(by_distance[0], by_distance[1:], zeros)
        zeros.remove(by_distance[0])
        sections.append(_section(zero_pair, pole_pair))
    return tuple(sections) or (Polynomials((1.0,), (1.0,)),)
