"""Repeated factors of a polynomial split off exactly. Polynomials are in descending powers, the first not 0."""

from collections.abc import Sequence
from fractions import Fraction

from streamhost.filters.exact import Polynomial, scaled

PRIME = (1 << 61) - 1


def square_free_factors(descending: Polynomial) -> list[tuple[Polynomial, int]]:
    """[(factor, multiplicity)]: monic factors without repeated roots whose powers multiply to the monic polynomial.

    Yun's algorithm (D. Y. Y. Yun, "On square-free decomposition algorithms", SYMSAC 1976).
    """
    slope = derivative(descending)
    if not slope:
        return []
    if _surely_square_free(descending, slope):
        return [(scaled(descending, 1 / descending[0]), 1)]
    common = common_divisor(descending, slope)
    rest = divided(descending, common)[0]
    shape = divided(slope, common)[0]
    factors = []
    multiplicity = 1
    while len(rest) > 1:
        excess = _difference(shape, derivative(rest))
        factor = common_divisor(rest, excess)
        if len(factor) > 1:
            factors.append((factor, multiplicity))
        rest = divided(rest, factor)[0]
        shape = divided(excess, factor)[0]
        multiplicity += 1
    return factors


def derivative(descending: Polynomial) -> Polynomial:
    degree = len(descending) - 1
    return tuple((degree - i) * value for i, value in enumerate(descending[:-1]))


def _leading(descending: Sequence[Fraction]) -> Polynomial:
    """Without leading zeros; the zero polynomial is empty."""
    start = next((i for i, value in enumerate(descending) if value), len(descending))
    return tuple(descending[start:])


def _difference(left: Polynomial, right: Polynomial) -> Polynomial:
    width = max(len(left), len(right))
    padded = [(Fraction(0),) * (width - len(side)) + side for side in (left, right)]
    return _leading([x - y for x, y in zip(*padded, strict=True)])


def divided(dividend: Polynomial, divisor: Polynomial) -> tuple[Polynomial, Polynomial]:
    """Quotient and remainder, descending powers, the divisor's first coefficient not 0."""
    rest = list(dividend)
    quotient = []
    for i in range(len(dividend) - len(divisor) + 1):
        factor = rest[i] / divisor[0]
        quotient.append(factor)
        if factor:
            for j, value in enumerate(divisor):
                rest[i + j] -= factor * value
    return tuple(quotient), _leading(rest)


def common_divisor(left: Polynomial, right: Polynomial) -> Polynomial:
    """The monic greatest common divisor (Euclid), descending powers."""
    while right:
        remainder = divided(left, right)[1]
        left, right = right, (scaled(remainder, 1 / remainder[0]) if remainder else ())
    return scaled(left, 1 / left[0])


def _surely_square_free(descending: Polynomial, slope: Polynomial) -> bool:
    """True is certain; False says nothing.

    A common divisor of the polynomial and its slope survives reduction modulo a prime that divides neither its
    leading coefficient nor a denominator. Fractions grow through Euclid's algorithm, residues do not: this spares
    a filter of a hundred taps many seconds.
    """
    if any(value.denominator % PRIME == 0 for value in descending) or descending[0].numerator % PRIME == 0:
        return False
    left, right = _residues(descending), _residues(slope)
    while right:
        left, right = right, _remainder_of_residues(left, right)
    return len(left) == 1


def _residues(polynomial: Polynomial) -> list[int]:
    residues = [value.numerator * pow(value.denominator, -1, PRIME) % PRIME for value in polynomial]
    return _without_leading_zeros(residues)


def _remainder_of_residues(dividend: list[int], divisor: list[int]) -> list[int]:
    rest = list(dividend)
    inverse = pow(divisor[0], -1, PRIME)
    for i in range(len(dividend) - len(divisor) + 1):
        factor = rest[i] * inverse % PRIME
        for j, residue in enumerate(divisor):
            rest[i + j] = (rest[i + j] - factor * residue) % PRIME
    return _without_leading_zeros(rest)


def _without_leading_zeros(residues: list[int]) -> list[int]:
    return residues[next((i for i, residue in enumerate(residues) if residue), len(residues)) :]
