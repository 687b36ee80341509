"""What a part of an equation amounts to: exact numbers times x[n-k] and y[n-k], and a constant."""

from collections.abc import Iterable
from dataclasses import dataclass, field
from fractions import Fraction

Signal = tuple[str, int]
"""A name and an age: ("y", 1) is y[n-1]."""


@dataclass
class Linear:
    """Coefficients by signal, and the constant beside them; zeros are kept, since they were written."""

    terms: dict[Signal, Fraction] = field(default_factory=dict)
    constant: Fraction = Fraction(0)

    def add(self, other: "Linear", sign: int = 1) -> None:
        self.constant += sign * other.constant
        for signal, coefficient in other.terms.items():
            self.terms[signal] = self.terms.get(signal, Fraction(0)) + sign * coefficient

    def scale(self, factor: Fraction) -> None:
        self.constant *= factor
        for signal in self.terms:
            self.terms[signal] *= factor

    def bits(self, signals: Iterable[Signal]) -> int:
        """The length of the longest numerator or denominator among those of these signals and the constant."""
        values = (self.constant, *(self.terms[signal] for signal in signals))
        return max(map(bits, values))


def bits(value: Fraction) -> int:
    """The length of the numerator or of the denominator, whichever is longer."""
    return max(value.numerator.bit_length(), value.denominator.bit_length())
