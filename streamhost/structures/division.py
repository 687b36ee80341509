"""A filter divided into sections, ready to be drawn."""

from collections.abc import Iterable
from dataclasses import dataclass

from streamhost.filters import Polynomials

Sections = tuple[Polynomials, ...]


@dataclass(frozen=True)
class Division:
    """Sections in the order in which they are drawn, a gain in front of the first (None: none), and what was chosen."""

    sections: Sections
    front: float | None
    pairing: str
    ordering: str
    scaling: str


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
