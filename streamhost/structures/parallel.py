"""Sections in parallel, by partial fractions: H = C(z^-1) + sum over k of N_k(z^-1) / D_k(z^-1).

A complex pole and its conjugate make a section of second order, a real pole one of first order; two real poles that
coincide, or nearly so, are merged into one of second order. C is what is left of a numerator as long as the denominator or
longer: a gain, or a finite response beside the sections (Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6,
parallel form).

Numerators are exact in the roots: N_k is the numerator times the inverse of the other denominators, modulo D_k. Each
coefficient is rounded once.
"""

from fractions import Fraction

import numpy as np

from streamhost.errors import StructureError
from streamhost.filters import Filter, Polynomials, ZerosPoles
from streamhost.filters.exact import ONE, Polynomial, from_roots, product, rounded, scaled
from streamhost.structures.cascade import check_order
from streamhost.structures.division import Division, Sections, trimmed

NEARLY = 1e-5
"""Real poles closer than that, as a share of their distance from z = 1 or z = -1, are merged."""

MOST_CANCELLED = 1e6
ANGLES = 4096


def divide(filter: Filter, pairing: str | None, ordering: str | None, scaling: str | None) -> Division:
    """The sections of a filter in parallel, those nearest the unit circle first, and what is beside them.

    StructureError where pairing, ordering or a scaling is stated, which have no meaning here; where there is no recursion to
    divide; and where complex poles or three real ones coincide, or so nearly that the sections cancel a millionfold, or where
    a pole so near 0 makes what stands beside the sections as large.
    """
    _check_choices(pairing, ordering, scaling)
    check_order(filter)
    solved = filter.zeros_poles()
    groups = _groups(solved.poles)
    if not groups:
        raise StructureError(
            'decomposition "parallel" divides by poles, and this filter has no recursion. Allowed for it are "whole" and '
            '"cascade".'
        )
    numerator = scaled((Fraction(0),) * solved.delay + from_roots(solved.zeros), Fraction(solved.gain))
    denominators = [from_roots(group) for group in groups]
    numerators = [_numerator(numerator, denominators, k) for k in range(len(groups))]
    sections = tuple(
        trimmed(Polynomials(rounded(n), rounded(d))) for n, d in zip(numerators, denominators, strict=True)
    )
    direct = rounded(_beside(numerator, numerators, denominators))
    _check_cancelling(solved, sections, direct)
    return Division(sections, None, "nearest", "inward", "none", direct=direct)


def _check_choices(pairing: str | None, ordering: str | None, scaling: str | None) -> None:
    for what, stated in (("pairing", pairing), ("ordering", ordering), ("scaling", scaling)):
        if stated not in (None, "none"):
            raise StructureError(
                f'{what} "{stated}" arranges sections in cascade, and decomposition "parallel" has none. Leave {what} out.'
            )


def _groups(poles: tuple[complex, ...]) -> list[tuple[complex, ...]]:
    """Pairs of conjugates and single real poles, nearest the circle first; merged pairs of real ones."""
    pairs: list[tuple[complex, ...]] = [(pole, pole.conjugate()) for pole in poles if pole.imag > 0]
    reals = sorted(pole.real for pole in poles if pole.imag == 0)
    singles: list[tuple[complex, ...]] = []
    while reals:
        first, *reals = reals
        if reals and reals[0] - first <= NEARLY * max(1e-300, 1.0 - min(1.0, abs(first))):
            second, *reals = reals
            singles.append((complex(first), complex(second)))
        else:
            singles.append((complex(first),))
    return sorted(pairs + singles, key=lambda group: (1.0 - abs(group[0]), group[0].real))


def _numerator(numerator: Polynomial, denominators: list[Polynomial], k: int) -> Polynomial:
    """The numerator over the other denominators, modulo the k-th; StructureError where that has a pole in common."""
    modulus = denominators[k]
    others = ONE
    for j, other in enumerate(denominators):
        if j != k:
            others = _reduced(product(others, other), modulus)
    inverse = _inverse(others, modulus)
    if inverse is None:
        raise StructureError(
            'decomposition "parallel" needs poles that differ, and this filter has the same pole in more than one section. '
            'Allowed for it are "cascade" and "whole".'
        )
    return _reduced(product(_reduced(numerator, modulus), inverse), modulus)


def _reduced(polynomial: Polynomial, modulus: Polynomial) -> Polynomial:
    """The remainder of a division by a modulus whose highest coefficient is not 0, as long as the modulus less one."""
    rest = list(polynomial)
    length = len(modulus) - 1
    for power in range(len(rest) - 1, length - 1, -1):
        factor = rest[power] / modulus[length]
        for i in range(length + 1):
            rest[power - length + i] -= factor * modulus[i]
    return tuple(rest[:length]) + (Fraction(0),) * (length - len(rest))


def _inverse(polynomial: Polynomial, modulus: Polynomial) -> Polynomial | None:
    """1 / (u + v x) modulo a polynomial of first or second degree; None where there is none."""
    u, v = (*polynomial, Fraction(0))[:2]
    if len(modulus) == 2:
        return (1 / u,) if u else None
    c0, c1, c2 = modulus
    # (u + v x)(s + t x) = 1 with x^2 = -(c0 + c1 x) / c2
    norm = u * u * c2 - u * v * c1 + v * v * c0
    return ((u * c2 - v * c1) / norm, -v * c2 / norm) if norm else None


def _beside(numerator: Polynomial, numerators: list[Polynomial], denominators: list[Polynomial]) -> Polynomial:
    """C: what the sections leave of the numerator, divided by all denominators; exact."""
    whole = ONE
    for denominator in denominators:
        whole = product(whole, denominator)
    rest = list(numerator) + [Fraction(0)] * (len(whole) - len(numerator))
    for k, part in enumerate(numerators):
        term = part
        for j, denominator in enumerate(denominators):
            term = product(term, denominator) if j != k else term
        for i, value in enumerate(term):
            rest[i] -= value
    quotient = [Fraction(0)] * max(1, len(rest) - len(whole) + 1)
    for place in range(len(rest) - len(whole), -1, -1):
        quotient[place] = rest[place + len(whole) - 1] / whole[-1]
        for i, value in enumerate(whole):
            rest[place + i] -= quotient[place] * value
    assert not any(rest), "partial fractions leave nothing over"
    return tuple(quotient)


def _check_cancelling(solved: ZerosPoles, sections: Sections, direct: tuple[float, ...]) -> None:
    z = np.exp(-1j * np.pi * (np.arange(ANGLES) + 0.5) / ANGLES)

    values = [[np.polynomial.polynomial.polyval(z, np.array(part)) for part in (section.b, section.a)] for section in sections]
    parts = [float(np.abs(b / a).max()) for b, a in values]
    zeros = np.prod([1.0 - zero * z for zero in solved.zeros], axis=0) if solved.zeros else np.ones_like(z)
    poles = np.prod([1.0 - pole * z for pole in solved.poles], axis=0)
    whole = float(np.abs(solved.gain * zeros / poles).max())
    beside = max(map(abs, direct))
    largest = max([*parts, beside])
    if largest > MOST_CANCELLED * whole:
        at_zero = beside > largest / 2  # the section of a pole near 0 and what stands beside it cancel each other
        reason = "a pole is nearly 0 beside more zeros than poles" if at_zero else "poles of it nearly coincide"
        raise StructureError(
            f'decomposition "parallel" makes a part of this filter {largest / whole:.0e} times as large as the sum of all, '
            f'since {reason}: what remains is the difference of large numbers. Allowed for it are "cascade" and "whole".'
        )
