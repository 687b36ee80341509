"""Floating point for the second evaluator: NumPy scalars, and exact fractions where a multiply-add is fused.

Written from the specification of the arithmetic; shares no code with the package.
"""

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

import numpy as np


class FloatArithmetic:
    """Sums, products and registers in IEEE 754 binary32 or binary64, ties to even."""

    def __init__(self, type: str, accumulator: str | None, fused: bool, flush_subnormals: bool) -> None:
        self.type = {"float32": np.float32, "float64": np.float64}[type]
        self.wide = np.float64 if accumulator == "float64" else self.type
        self.fused, self.flush = fused, flush_subnormals

    def start(self, sample: Any) -> Any:
        return self.type(sample)

    def end(self, y: Any) -> float:
        return float(self.type(y))

    def store(self, value: Any) -> Any:
        tiny = np.finfo(self.type).tiny
        return self.type(0) if self.flush and abs(value) < tiny else self.type(value)

    def zero_state(self) -> Any:
        return self.type(0)

    def zero_like(self, value: Any) -> Any:
        return self.type(0)

    def times(self, coefficient: float, value: Any) -> tuple[Any, Any]:
        return self.wide(self.type(coefficient)), self.wide(self.type(value))

    def minus_times(self, coefficient: float, value: Any) -> tuple[Any, Any]:
        c, v = self.times(coefficient, value)
        return -c, v

    def sum(self, terms: Sequence[Any]) -> Any:
        total = None
        for term in terms:
            if total is None:
                total = term[0] * term[1] if isinstance(term, tuple) else self.wide(term)
            elif not isinstance(term, tuple):
                total = total + self.wide(term)
            elif self.fused:
                total = self._fma(term[0], term[1], total)
            else:
                total = total + term[0] * term[1]
        return total

    def _fma(self, c: Any, v: Any, s: Any) -> Any:
        exact = Fraction(float(c)) * Fraction(float(v)) + Fraction(float(s))
        return nearest_float(exact, self.wide) if exact else c * v + s

    def register(self, total: Any, *, delayed: bool) -> Any:
        return self.type(total)

    def pre_sum(self, first: Any, second: Any) -> Any:
        return self.sum([first, second])


def nearest_float(exact: Fraction, type: Any) -> Any:
    """The nearest number of the type, ties to even, rounded once."""
    facts = np.finfo(type)
    size = abs(exact)
    exponent = size.numerator.bit_length() - size.denominator.bit_length()
    exponent -= size < Fraction(2) ** exponent
    step = Fraction(2) ** (max(exponent, int(facts.minexp)) - int(facts.nmant))
    return type(float(round(exact / step) * step))
