"""The roots of a real polynomial with float64 coefficients, accurate to the last bit or nearly so.

Repeated roots are split off exactly first; what is left has simple roots and is solved in many digits, so that
neither a cluster near z = 1 nor a repeated root costs accuracy. Roots are those of the coefficients as they stand.
"""

from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache

from streamhost.errors import FilterError
from streamhost.filters.exact import Polynomial, exactly, square_root, to_mpf
from streamhost.filters.square_free import square_free_factors

BITS = 400
ATTEMPTS = 6

# A root nearer to the unit circle than this is taken to lie on it. float64 coefficients do not place a root so
# near without placing it there.
ON_CIRCLE = Fraction(1, 1 << (BITS // 2))


@dataclass(frozen=True)
class _Root:
    """A real root, or the upper one of a conjugate pair, in many digits."""

    real: Fraction
    imaginary: Fraction
    multiplicity: int

    @property
    def count(self) -> int:
        return self.multiplicity * (2 if self.imaginary else 1)


def roots(descending: tuple[float, ...] | Polynomial) -> tuple[complex, ...]:
    """Roots in z of a polynomial in descending powers of z (which is A(z^-1) read as it stands).

    First and last coefficient must not be 0. Each root is rounded once to complex128 and repeated as often as it
    occurs; a complex root is followed by its exact conjugate, upper half plane first; real roots come last.
    """
    complex_roots: list[complex] = []
    real_roots: list[complex] = []
    for root in _precise(descending):
        rounded = complex(float(root.real), float(root.imaginary))
        if root.imaginary:
            complex_roots += [rounded, rounded.conjugate()] * root.multiplicity
        else:
            real_roots += [rounded] * root.multiplicity
    return tuple(complex_roots + real_roots)


def roots_outside(descending: tuple[float, ...] | Polynomial, *, on_circle: bool = True) -> int:
    """How many roots lie outside the unit circle, or on it (to within 2^-200), counted before they are rounded."""
    least = 1 - ON_CIRCLE if on_circle else 1 + ON_CIRCLE
    return sum(root.count for root in _precise(descending) if root.real**2 + root.imaginary**2 >= least)


@lru_cache(maxsize=256)
def _precise(descending: tuple[float, ...] | Polynomial) -> tuple[_Root, ...]:
    assert descending[0] != 0 and descending[-1] != 0
    polynomial = exactly(descending)
    if len(polynomial) <= 3:
        return tuple(_of_short(polynomial))
    return tuple(
        _Root(real, imaginary, multiplicity)
        for factor, multiplicity in square_free_factors(polynomial)
        for real, imaginary in _of_simple(factor)
    )


def _of_simple(polynomial: Polynomial) -> list[tuple[Fraction, Fraction]]:
    if len(polynomial) <= 3:
        return [(root.real, root.imaginary) for root in _of_short(polynomial)]
    return _of_long(polynomial)


def _of_short(polynomial: Polynomial) -> list[_Root]:
    """Order 0, 1 or 2 by the quadratic formula, without cancellation."""
    monic = [value / polynomial[0] for value in polynomial]
    if len(monic) == 1:
        return []
    if len(monic) == 2:
        return [_Root(-monic[1], Fraction(0), 1)]
    middle = -monic[1] / 2
    discriminant = middle * middle - monic[2]
    if discriminant == 0:
        return [_Root(middle, Fraction(0), 2)]
    if discriminant < 0:
        return [_Root(middle, square_root(-discriminant), 1)]
    distance = square_root(discriminant)
    larger = middle + distance if middle >= 0 else middle - distance
    return [_Root(larger, Fraction(0), 1), _Root(monic[2] / larger, Fraction(0), 1)]


def _of_long(polynomial: Polynomial) -> list[tuple[Fraction, Fraction]]:
    """Simple roots in BITS bits by simultaneous iteration (Durand-Kerner), with more digits until it converges."""
    import mpmath

    scale = 1 << (2 * BITS)
    for attempt in range(ATTEMPTS):
        with mpmath.workprec(BITS):
            coefficients = [*map(to_mpf, polynomial)]
            try:
                found = mpmath.polyroots(
                    coefficients[::-1], maxsteps=200 << attempt, extraprec=BITS << attempt, asc=True
                )
            except mpmath.mp.NoConvergence:
                continue
            halves = [
                (Fraction(int(mpmath.re(root) * scale), scale), Fraction(int(mpmath.im(root) * scale), scale))
                for root in found
                if mpmath.im(root) >= 0
            ]
        if sum(2 if imaginary else 1 for _, imaginary in halves) == len(found):
            return halves
    raise FilterError(
        f"the roots of a polynomial of order {len(polynomial) - 1} could not be found in "
        f"{BITS << (ATTEMPTS - 1)} bits; give the filter as zeros and poles, or as sections."
    )
