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
PRODUCTS_AT_ONCE = 1 << 15


@dataclass(frozen=True)
class Doubled:
    """A matrix high + low, both of one shape."""

    high: FloatArray
    low: FloatArray

    def __matmul__(self, other: "Doubled") -> "Doubled":
        """All products of some rows at once, as many as stay near the processor."""
        rows, columns = self.high.shape[0], other.high.shape[1]
        high, low = np.zeros((2, rows, columns))
        at_once = max(1, PRODUCTS_AT_ONCE // max(1, other.high.size))
        for first in range(0, rows, at_once):
            part = slice(first, first + at_once)
            high[part], low[part] = _rows_product(self.high[part], self.low[part], other)
        return Doubled(high, low)

    def __add__(self, other: "Doubled") -> "Doubled":
        total, lost = _sum(self.high, other.high)
        return Doubled(*_sum(total, lost + (self.low + other.low)))

    def __neg__(self) -> "Doubled":
        return Doubled(-self.high, -self.low)

    def columns(self, places: Sequence[int]) -> "Doubled":
        """Some columns, in the order asked for."""
        return Doubled(self.high[:, list(places)], self.low[:, list(places)])

    def scaled(self, *, rows: FloatArray | None = None, columns: FloatArray | None = None) -> "Doubled":
        """Each row, each column times a power of two, which rounds nothing."""
        factors: FloatArray = np.ones((1, 1)) if rows is None else rows[:, np.newaxis]
        factors = factors if columns is None else factors * columns
        return Doubled(self.high * factors, self.low * factors)

    def transposed(self) -> "Doubled":
        return Doubled(self.high.T, self.low.T)

    def beside(self, other: "Doubled") -> "Doubled":
        """The columns of both, these first."""
        return Doubled(np.hstack([self.high, other.high]), np.hstack([self.low, other.low]))

    def over(self, other: "Doubled") -> "Doubled":
        """The rows of both, these first."""
        return Doubled(np.vstack([self.high, other.high]), np.vstack([self.low, other.low]))


def doubled(matrix: FloatArray) -> Doubled:
    return Doubled(matrix, np.zeros_like(matrix))


def squares(matrix: Doubled, count: int) -> list[Doubled]:
    """M, M^2, M^4, ..., count of them."""
    found = [matrix]
    while len(found) < count:
        found.append(found[-1] @ found[-1])
    return found


def power(raised: Sequence[Doubled], exponent: int) -> Doubled:
    """The matrix raised to an exponent, from `squares` as far as that needs them."""
    result: Doubled | None = None
    for place in range(exponent.bit_length()):
        if exponent >> place & 1:
            result = raised[place] if result is None else result @ raised[place]
    return doubled(np.eye(len(raised[0].high))) if result is None else result


def krylov(rows: Doubled, raised: Sequence[Doubled], count: int) -> Doubled:
    """rows, rows M, rows M^2, ..., count of them under each other; each time twice as many, by the `squares` of M."""
    one = len(rows.high)
    found, doubling = rows, 0
    while len(found.high) < count * one:
        found = found.over(found @ raised[doubling])
        doubling += 1
    return Doubled(found.high[: count * one], found.low[: count * one])


def _rows_product(high: FloatArray, low: FloatArray, other: Doubled) -> tuple[FloatArray, FloatArray]:
    """Some rows times a matrix, high and low; inside terms come first and rows last, along which numpy is quick.

    Terms are added in pairs, then pairs of pairs.
    """
    left, left_low = high.T[:, np.newaxis, :], low.T[:, np.newaxis, :]
    right, right_low = other.high[:, :, np.newaxis], other.low[:, :, np.newaxis]
    products, errors = _product(left, right)
    errors += left * right_low + left_low * right
    while (count := len(products)) > 1:
        half = count // 2
        total, lost = _sum(products[:half], products[half : 2 * half])
        rest = errors[:half] + errors[half : 2 * half] + lost
        products = np.concatenate([total, products[2 * half :]])
        errors = np.concatenate([rest, errors[2 * half :]])
    if not len(products):
        return np.zeros((len(high), other.high.shape[1])), np.zeros((len(high), other.high.shape[1]))
    total, rest = _sum(products[0], errors[0])
    return total.T, rest.T


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
