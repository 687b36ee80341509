"""A filter divided into sections, ready to be drawn."""

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction

from streamhost.filters import Polynomials
from streamhost.filters.exact import Polynomial, exactly

Sections = tuple[Polynomials, ...]


@dataclass(frozen=True)
class Ratio:
    """B / A of a section in exact numbers, ascending powers of z^-1, a[0] = 1, without trailing zeros."""

    b: Polynomial
    a: Polynomial

    @property
    def order(self) -> int:
        return max(len(self.a), len(self.b)) - 1

    @property
    def padded(self) -> tuple[Polynomial, Polynomial]:
        """b and a with zeros after them, order + 1 of each."""
        length = self.order + 1
        b, a = ((*values, *[Fraction(0)] * (length - len(values))) for values in (self.b, self.a))
        return b, a

    @property
    def is_recursive(self) -> bool:
        return len(self.a) > 1


def ratio_of(section: Polynomials) -> Ratio:
    """The exact ratio of rounded polynomials."""
    return Ratio(exactly(section.b), exactly(section.a))


@dataclass(frozen=True)
class Division:
    """Sections in the order in which they are drawn, a gain in front of the first (None: none), and what was chosen.

    `shifts`: the powers of two before each section and behind the last, where the scaling is made of them; else empty.
    `all_outputs`: whether the form's further outputs are drawn.
    `direct`: the finite response beside sections in parallel; None where they are in series.

    `undivided`: the filter itself in exact numbers, where it is the one section as it stands.
    """

    sections: Sections
    front: float | None
    pairing: str
    ordering: str
    scaling: str
    undivided: Ratio | None = None
    shifts: tuple[int, ...] = ()
    direct: tuple[float, ...] | None = None
    all_outputs: bool = False

    def ratio(self, index: int) -> Ratio:
        """A section in exact numbers: of an undivided filter before its coefficients were rounded."""
        return self.undivided or ratio_of(self.sections[index])


@dataclass(frozen=True)
class Part:
    """Sections in series: those to the output `name`, or, without a name, those that all outputs have in common."""

    name: str
    division: Division


Parts = tuple[Part, ...]
"""Of a filter: the common sections, if there are some, then those to each output; of one output all are common."""


def trimmed(section: Polynomials) -> Polynomials:
    """Without the trailing zeros of numerator and denominator; one coefficient of each always stays."""
    return Polynomials(_trimmed(section.b), _trimmed(section.a))


def all_trimmed(sections: Iterable[Polynomials]) -> Sections:
    return tuple(trimmed(section) for section in sections)


def _trimmed(coefficients: tuple[float, ...]) -> tuple[float, ...]:
    length = len(coefficients)
    while length > 1 and coefficients[length - 1] == 0:
        length -= 1
    return coefficients[:length]
