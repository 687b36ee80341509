"""What the forms for finite responses ask of a numerator."""

from fractions import Fraction

from streamhost.filters.exact import Polynomial
from streamhost.structures.division import Ratio

ROUNDED = Fraction(1, 1 << 50)
"""How far taps that are meant to be equal may differ, as a part of the largest: what rounding leaves of them."""


def lead_of(b: Polynomial) -> int:
    """How many taps are 0 before the first that is not; 0 where all are."""
    return next((k for k, value in enumerate(b) if value), 0)


def refused_recursion(ratio: Ratio) -> str:
    """Why a section with a denominator is no finite response, "" where there is none."""
    return "" if not ratio.is_recursive else "it has a recursion, and this form is for finite responses"


def symmetry_of(b: Polynomial) -> int:
    """+1 where the taps read the same from both ends, -1 where with the sign turned, 0 where neither."""
    allowed = ROUNDED * max(map(abs, b))
    for sign in (1, -1):
        if all(abs(x - sign * y) <= allowed for x, y in zip(b, reversed(b), strict=True)):
            return sign
    return 0


def mirrored(b: Polynomial, symmetry: int) -> Polynomial:
    """The taps with each pair at its mean, so that they have the symmetry to the last bit."""
    return tuple((x + symmetry * y) / 2 for x, y in zip(b, reversed(b), strict=True))
