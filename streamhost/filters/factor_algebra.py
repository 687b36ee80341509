"""What can be asked of one factor of a filter: its degrees, its polynomials, its roots, its response."""

from collections.abc import Iterable
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from streamhost.errors import FilterError
from streamhost.filters import response
from streamhost.filters.exact import Polynomial, exactly, from_roots, rounded, scaled, stripped
from streamhost.filters.factors import Codes, Polynomials, ZerosPoles
from streamhost.filters.roots import roots

Factor = Polynomials | ZerosPoles


def normalized(numerator: Polynomial, denominator: Polynomial) -> Polynomials:
    """Both divided by the first coefficient of the denominator, each quotient rounded once."""
    inverse = 1 / denominator[0]
    return Polynomials(rounded(scaled(numerator, inverse)), rounded(scaled(denominator, inverse)))


def joined_codes(codes: list[Codes | None]) -> Codes | None:
    """The codes of a cascade. FilterError where some of its filters are given as codes and others are not."""
    given = [table for table in codes if table is not None]
    if not given:
        return None
    words = sorted({table.word for table in given})
    if len(given) < len(codes) or len(words) > 1:
        raise FilterError(
            f"a cascade joins a filter given as codes ({', '.join(words)}) with one that is given otherwise; "
            "codes stand only beside codes of the same word. Give all as codes, or all as numbers."
        )
    return Codes(tuple(row for table in given for row in table.rows), words[0])


def degrees(factor: Factor) -> tuple[int, int]:
    """Of B and A in z^-1."""
    if isinstance(factor, ZerosPoles):
        return len(factor.zeros) + factor.delay, len(factor.poles)
    return len(stripped(exactly(factor.b))) - 1, len(stripped(exactly(factor.a))) - 1


def expanded(factor: Factor) -> tuple[Polynomial, Polynomial]:
    """Exact polynomials in ascending powers of z^-1."""
    if isinstance(factor, Polynomials):
        return exactly(factor.b), exactly(factor.a)
    delayed = (Fraction(0),) * factor.delay + from_roots(factor.zeros)
    return scaled(delayed, Fraction(factor.gain)), from_roots(factor.poles)


def solved(factor: Factor) -> ZerosPoles:
    """The factor by its roots."""
    if isinstance(factor, ZerosPoles):
        return factor
    b, a = factor.b[: degrees(factor)[0] + 1], factor.a[: degrees(factor)[1] + 1]
    if b == (0.0,):
        return ZerosPoles((), roots(a), 0.0)
    delay = next(i for i, value in enumerate(b) if value != 0)
    return ZerosPoles(roots(b[delay:]), roots(a), b[delay], delay)


def gathered(groups: Iterable[tuple[complex, ...]]) -> tuple[complex, ...]:
    """Conjugate pairs before real roots, otherwise in their order."""
    everything = [root for group in groups for root in group]
    return tuple([r for r in everything if r.imag != 0] + [r for r in everything if r.imag == 0])


def response_of(factor: Factor, points: response.Circle) -> npt.NDArray[np.complex128]:
    """H at each point; infinite or NaN on a pole."""
    if isinstance(factor, ZerosPoles):
        return response.of_zeros_poles(factor, points)
    return response.of_polynomials(factor, points)
