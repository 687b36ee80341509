"""Products of matrices in double-double: each entry a sum of two float64, good to about 31 digits.

T. Dekker, "A floating-point technique for extending the available precision", Numerische Mathematik 18, 1971; only
additions and multiplications, so that the bits are the same on every machine.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
SPLIT = 134217729.0  # 2^27 + 1


@dataclass(frozen=True)
class Doubled:
    """A matrix high + low, both of one shape."""

    high: FloatArray
    low: FloatArray

    def __matmul__(self, other: "Doubled") -> "Doubled":
        high = np.zeros((self.high.shape[0], other.high.shape[1]))
        low = np.zeros_like(high)
        for k in range(self.high.shape[1]):
            left, right = self.high[:, k, np.newaxis], other.high[np.newaxis, k]
            product, error = _product(left, right)
            error = error + (left * other.low[np.newaxis, k] + self.low[:, k, np.newaxis] * right)
            high, lost = _sum(high, product)
            low = low + (lost + error)
        return Doubled(*_sum(high, low))

    def __add__(self, other: "Doubled") -> "Doubled":
        total, lost = _sum(self.high, other.high)
        return Doubled(*_sum(total, lost + (self.low + other.low)))

    def __neg__(self) -> "Doubled":
        return Doubled(-self.high, -self.low)

    def columns(self, places: Sequence[int]) -> "Doubled":
        """Some columns, in the order asked for."""
        return Doubled(self.high[:, list(places)], self.low[:, list(places)])

    def beside(self, other: "Doubled") -> "Doubled":
        """The columns of both, these first."""
        return Doubled(np.hstack([self.high, other.high]), np.hstack([self.low, other.low]))

    def over(self, other: "Doubled") -> "Doubled":
        """The rows of both, these first."""
        return Doubled(np.vstack([self.high, other.high]), np.vstack([self.low, other.low]))


def doubled(matrix: FloatArray) -> Doubled:
    return Doubled(matrix, np.zeros_like(matrix))


def power(matrix: Doubled, exponent: int) -> Doubled:
    """By squaring."""
    result = doubled(np.eye(len(matrix.high)))
    while exponent:
        if exponent & 1:
            result = result @ matrix
        exponent >>= 1
        if exponent:
            matrix = matrix @ matrix
    return result


def krylov(rows: Doubled, matrix: Doubled, count: int) -> Doubled:
    """rows, rows M, rows M^2, ..., count of them under each other; each time twice as many."""
    one = len(rows.high)
    found, leap = rows, matrix
    while len(found.high) < count * one:
        found = found.over(found @ leap)
        if len(found.high) < count * one:
            leap = leap @ leap
    return Doubled(found.high[: count * one], found.low[: count * one])


def _sum(a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    total = a + b
    part = total - a
    return total, (a - (total - part)) + (b - part)


def _product(a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    product = a * b
    a_high, a_low = _halves(a)
    b_high, b_low = _halves(b)
    return product, ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low


def _halves(a: FloatArray) -> tuple[FloatArray, FloatArray]:
    high = SPLIT * a
    high = high - (high - a)
    return high, a - high
