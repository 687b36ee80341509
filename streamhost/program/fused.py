"""Correctly rounded a*b + c on floats, by exact rational arithmetic."""

from fractions import Fraction
from math import copysign, inf, isfinite

import numpy as np

Real = np.float32 | np.float64


def fused_multiply_add(a: Real, b: Real, c: Real) -> Real:
    """fma(a, b, c) in the type of its arguments, rounded once, ties to even (IEEE 754-2019, 5.4.1)."""
    kind = type(c)
    if not (isfinite(a) and isfinite(b) and isfinite(c)):
        return kind(np.float64(a) * np.float64(b) + np.float64(c))
    exact = Fraction(float(a)) * Fraction(float(b)) + Fraction(float(c))
    if exact == 0:
        return kind(a * b + c) if float(a) * float(b) == 0.0 else kind(0.0)
    return kind(float(exact) if kind is np.float64 else to_float32(exact))


def to_float32(value: Fraction) -> float:
    """The nearest binary32 value, ties to even, with gradual underflow and overflow to infinity."""
    magnitude = abs(value)
    exponent = max(-126, _floor_log2(magnitude))
    scale = Fraction(2) ** (exponent - 23)
    code = round(magnitude / scale)
    result = code * scale
    largest = (2 - Fraction(1, 1 << 23)) * Fraction(2) ** 127
    return copysign(inf if result > largest else float(result), value)


def _floor_log2(value: Fraction) -> int:
    estimate = value.numerator.bit_length() - value.denominator.bit_length()
    return estimate if value >= Fraction(2) ** estimate else estimate - 1
