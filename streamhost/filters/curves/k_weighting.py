"""K weighting: Rec. ITU-R BS.1770, Annex 1, Tables 1 and 2 (as quoted), which state two sections at 48 kHz."""

from fractions import Fraction

from streamhost.filters.filter import Filter

TABULATED_RATE = 48000

# b0 b1 b2 a0 a1 a2: the pre-filter (a head's shelf), then the high-pass.
TABULATED = (
    (1.53512485958697, -2.69169618940638, 1.19839281085285, 1.0, -1.69065929318241, 0.73248077421585),
    (1.0, -2.0, 1.0, 1.0, -1.99004745483398, 0.99007225036621),
)


def k_weighting(rate: float) -> Filter:
    """At 48 kHz the sections as tabulated; at other rates the same analogue sections transformed again.

    Undoing the bilinear transform at 48 kHz and doing it at another rate is to put an all-pass of first order in the
    place of z^-1 (Oppenheim & Schafer, ch. 7, transformations of low-pass filters). That is done on exact fractions.
    """
    ratio = Fraction(rate) / TABULATED_RATE
    alpha = (ratio - 1) / (ratio + 1)
    rows = [[*_replaced(row[:3], alpha), *_replaced(row[3:], alpha)] for row in TABULATED]
    return Filter.from_sections(rows, rate=rate)


def _replaced(coefficients: tuple[float, ...], alpha: Fraction) -> list[Fraction]:
    """c0 + c1 w + c2 w^2 with w = (v - alpha) / (1 - alpha v), times (1 - alpha v)^2, in powers of v = z^-1."""
    c0, c1, c2 = map(Fraction, coefficients)
    square = alpha * alpha
    return [
        c0 - c1 * alpha + c2 * square,
        -2 * alpha * c0 + c1 * (1 + square) - 2 * alpha * c2,
        c0 * square - c1 * alpha + c2,
    ]
