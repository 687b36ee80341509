"""The three ways in which a part of a filter is kept, exactly as it was given."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Polynomials:
    """B(z) / A(z), both in ascending powers of z^-1; a[0] is 1."""

    b: tuple[float, ...]
    a: tuple[float, ...]


@dataclass(frozen=True)
class ZerosPoles:
    """H(z) = gain z^-delay prod(1 - z_i z^-1) / prod(1 - p_i z^-1).

    A complex root is followed by its exact conjugate, upper half plane first; real roots come last. Roots at
    exactly 0 contribute nothing to the products and are not kept.
    """

    zeros: tuple[complex, ...]
    poles: tuple[complex, ...]
    gain: float
    delay: int = 0


@dataclass(frozen=True)
class Codes:
    """The integers of a table of sections: rows of b0 b1 b2 a0 a1 a2, in the transfer function's sign.

    `word` is such as "Q4.12"; a code is the value times 2^12. a0 is always the code of 1, whether or not it fits
    the word: a table of five columns leaves it out for that reason.
    """

    rows: tuple[tuple[int, ...], ...]
    word: str
