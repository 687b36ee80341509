"""Polynomials on exact rational numbers, rounded once at the end.

A polynomial is a tuple of `Fraction`, in ascending powers (of z^-1, mostly) or in descending ones (of z), as the
parameter's name says; a product does not mind which, as long as both operands agree.
"""

from collections.abc import Iterable, Sequence
from fractions import Fraction
from math import isqrt
from typing import Any

from streamhost.errors import FilterError
from streamhost.filters.factors import Polynomials

Polynomial = tuple[Fraction, ...]

ONE: Polynomial = (Fraction(1),)
ROOT_BITS = 256


def to_mpf(value: Fraction) -> Any:
    """In mpmath's working precision."""
    import mpmath

    return mpmath.mpf(value.numerator) / value.denominator


def exactly(values: Iterable[float | Fraction]) -> Polynomial:
    """The polynomial with exactly these coefficients."""
    return tuple(Fraction(value) for value in values)


def rounded(polynomial: Iterable[Fraction]) -> tuple[float, ...]:
    """The nearest float64 of each coefficient; FilterError where one is beyond float64."""
    try:
        return tuple(float(value) for value in polynomial)
    except OverflowError:
        raise FilterError(
            "a coefficient of the product is larger than float64 holds (about 1.8e308): "
            "the gains of the factors are too large."
        ) from None


def stripped(polynomial: Sequence[Fraction]) -> Polynomial:
    """Without trailing zeros; one coefficient always stays."""
    length = len(polynomial)
    while length > 1 and polynomial[length - 1] == 0:
        length -= 1
    return tuple(polynomial[:length])


def product(left: Polynomial, right: Polynomial) -> Polynomial:
    result = [Fraction(0)] * (len(left) + len(right) - 1)
    for i, x in enumerate(left):
        if x:
            for j, y in enumerate(right):
                result[i + j] += x * y
    return tuple(result)


def scaled(polynomial: Polynomial, factor: Fraction) -> Polynomial:
    return tuple(factor * value for value in polynomial)


def value(ascending: Polynomial, point: Fraction) -> Fraction:
    """The value at a rational point, by Horner's rule."""
    result = Fraction(0)
    for coefficient in reversed(ascending):
        result = result * point + coefficient
    return result


def from_roots(roots: Iterable[complex]) -> Polynomial:
    """prod(1 - r z^-1) in ascending powers of z^-1, exact in the float64 parts of the roots.

    Of a conjugate pair the upper root speaks for both: 1 - 2 Re r z^-1 + |r|^2 z^-2.
    """
    result = ONE
    for root in roots:
        real, imaginary = Fraction(root.real), Fraction(root.imag)
        if imaginary > 0:
            result = product(result, (Fraction(1), -2 * real, real * real + imaginary * imaginary))
        elif imaginary == 0:
            result = product(result, (Fraction(1), -real))
    return result


def conjugate_section(zeros: Sequence[complex], poles: Sequence[complex], gain: float) -> Polynomials:
    """gain prod(1 - z_i z^-1) / prod(1 - p_i z^-1) as polynomials, each coefficient exact and then rounded once.

    Meant for up to two roots a side: a conjugate pair (both given), two real ones, one, or none.
    """
    for roots in (zeros, poles):
        upper = sum(root.imag > 0 for root in roots)
        lower = sum(root.imag < 0 for root in roots)
        assert upper == lower, "a complex root without its conjugate"
    numerator = scaled(from_roots(zeros), Fraction(gain))
    return Polynomials(rounded(numerator), rounded(from_roots(poles)))


def to_multiple(number: Fraction, bits: int) -> Fraction:
    """The nearest multiple of 2^-bits: what keeps the numbers of a long calculation short."""
    return Fraction(round(number * (1 << bits)), 1 << bits)


def square_root(number: Fraction) -> Fraction:
    """The square root of a number >= 0, low by less than 2^-ROOT_BITS of itself."""
    if number == 0:
        return number
    shift = ROOT_BITS + 1 + max(0, number.denominator.bit_length() - number.numerator.bit_length())
    whole = (number.numerator << 2 * shift) // number.denominator
    return Fraction(isqrt(whole), 1 << shift)
