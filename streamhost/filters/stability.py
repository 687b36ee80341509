"""Stability decided exactly, on the coefficients or poles as they stand in float64."""

from fractions import Fraction

from streamhost.filters.exact import Polynomial, exactly, stripped
from streamhost.filters.factors import Polynomials, ZerosPoles
from streamhost.filters.roots import roots_outside


def is_stable(ascending: Polynomial) -> bool:
    """Whether 1 / A(z) is stable: all roots of A inside the unit circle. Ascending powers of z^-1, a[0] not 0.

    Step-down recursion (Schur-Cohn test) on exact fractions: stable if and only if every reflection coefficient is
    less than 1 in magnitude (Oppenheim & Schafer, lattice filters; Mitra, stability test by all-pass sections).
    """
    rest = [value / ascending[0] for value in ascending]
    while len(rest) > 1:
        reflection = rest[-1]
        if abs(reflection) >= 1:
            return False
        scale = 1 - reflection * reflection
        rest = [(x - reflection * y) / scale for x, y in zip(rest, reversed(rest), strict=True)][:-1]
    return True


def unstable_poles(factor: Polynomials | ZerosPoles) -> int:
    """How many poles of a factor lie on or outside the unit circle; 0 if and only if the factor is stable.

    Of polynomials, stable or not is decided by an exact test, and only the number of an unstable one rests on its
    roots (in 400 bits). Zeros that cancel poles cancel nothing here.
    """
    if isinstance(factor, ZerosPoles):
        return sum(Fraction(p.real) ** 2 + Fraction(p.imag) ** 2 >= 1 for p in factor.poles)
    denominator = stripped(exactly(factor.a))
    if is_stable(denominator):
        return 0
    return max(1, roots_outside(factor.a[: len(denominator)]))
