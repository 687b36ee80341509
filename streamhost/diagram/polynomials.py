"""Polynomials with exact coefficients, lowest power first: determinants of them, and what they have in common."""

from collections.abc import Sequence
from fractions import Fraction
from math import gcd, lcm, prod

Polynomial = list[Fraction]
Matrix = list[list[int]]


def trimmed(a: Sequence[Fraction]) -> Polynomial:
    """Without zeros at the highest powers; the polynomial 0 is empty."""
    length = len(a)
    while length and a[length - 1] == 0:
        length -= 1
    return list(a[:length])


def product(a: Sequence[Fraction], b: Sequence[Fraction]) -> Polynomial:
    result = [Fraction(0)] * max(len(a) + len(b) - 1, 0)
    for i, x in enumerate(a):
        if x:
            for k, y in enumerate(b):
                if y:
                    result[i + k] += x * y
    return trimmed(result)


def quotient(a: Sequence[Fraction], b: Sequence[Fraction]) -> Polynomial:
    """a / b where b divides a and has a constant term: the power series' first terms."""
    rest, result = list(a), []
    for i in range(len(a) - len(b) + 1):
        result.append(rest[i] / b[0])
        for k, y in enumerate(b):
            rest[i + k] -= result[-1] * y
    assert not any(rest), "the divisor does not divide"
    return trimmed(result)


def common_factor(a: Sequence[Fraction], b: Sequence[Fraction]) -> Polynomial:
    """The greatest common divisor, by primitive remainders on integers (D. Knuth, Seminumerical Algorithms, 4.6.1)."""
    x, y = _primitive(trimmed(a)), _primitive(trimmed(b))
    while y:
        x, y = y, _primitive(_pseudo_remainder(x, y))
    return [Fraction(c) for c in x]


def _primitive(a: Sequence[Fraction] | Sequence[int]) -> list[int]:
    """The same polynomial but for a factor, on integers without a common divisor."""
    shared = lcm(*(c.denominator for c in a))
    integers = [int(c * shared) for c in a]
    content = gcd(*integers)
    return [c // content for c in integers]


def _pseudo_remainder(a: list[int], b: list[int]) -> list[int]:
    rest = list(a)
    while len(rest) >= len(b):
        top, start = rest[-1], len(rest) - len(b)
        rest = [c * b[-1] for c in rest]
        for k, y in enumerate(b):
            rest[start + k] -= top * y
        while rest and rest[-1] == 0:
            rest.pop()
    return rest


def determinant(matrix: Sequence[Sequence[dict[int, Fraction]]]) -> Polynomial:
    """The determinant of a square matrix of polynomials, each {power: coefficient}.

    Every row is brought to integers; the variable becomes a power of two so large that the coefficients of the
    result cannot run into each other, and the determinant one of integers (Kronecker's substitution).
    """
    scales = [lcm(*(c.denominator for entry in row for c in entry.values())) for row in matrix]
    bits = _coefficient_bits(matrix, scales)
    numbers = [[sum(int(c * scale) << (bits * power) for power, c in entry.items()) for entry in row]
               for row, scale in zip(matrix, scales, strict=True)]
    return [Fraction(c, prod(scales)) for c in _digits(_integer_determinant(numbers), bits)]


def determinant_bits(matrix: Sequence[Sequence[dict[int, Fraction]]]) -> int:
    """The length of the integers that `determinant` works with, which decides its cost."""
    scales = [lcm(*(c.denominator for entry in row for c in entry.values())) for row in matrix]
    degree = sum(max(max(entry, default=0) for entry in row) for row in matrix)
    return _coefficient_bits(matrix, scales) * (degree + 1)


def _coefficient_bits(matrix: Sequence[Sequence[dict[int, Fraction]]], scales: Sequence[int]) -> int:
    """Bits that hold any coefficient of the determinant, with its sign: it is at most the product of the rows' sums."""
    sums = [sum(abs(c) for entry in row for c in entry.values()) for row in matrix]
    return sum(int(s * scale).bit_length() for s, scale in zip(sums, scales, strict=True)) + 2


def _digits(number: int, bits: int) -> list[int]:
    """The signed digits of a number to the base 2^bits, lowest first."""
    digits = []
    half, mask = 1 << (bits - 1), (1 << bits) - 1
    while number:
        digit = ((number + half) & mask) - half
        digits.append(digit)
        number = (number - digit) >> bits
    return digits


def _integer_determinant(matrix: Matrix) -> int:
    """Without fractions (E. Bareiss, Mathematics of Computation 22, 1968)."""
    rows, sign, last = [list(row) for row in matrix], 1, 1
    size = len(rows)
    for k in range(size - 1):
        pivot = next((i for i in range(k, size) if rows[i][k]), None)
        if pivot is None:
            return 0
        if pivot != k:
            rows[k], rows[pivot], sign = rows[pivot], rows[k], -sign
        for i in range(k + 1, size):
            for j in range(k + 1, size):
                rows[i][j] = (rows[i][j] * rows[k][k] - rows[i][k] * rows[k][j]) // last
        last = rows[k][k]
    return sign * rows[-1][-1] if rows else 1
