"""Frequency weightings as analog responses.

A: IEC 61672-1:2013, Annex E: poles twice at f1 and f4, once at f2 and f3, four zeros at 0 Hz, 0 dB at 1 kHz. The pole
frequencies follow from fL = 10^1.5 Hz, fH = 10^3.9 Hz, fA = 10^2.45 Hz and the 3 dB points at fr = 1 kHz.
ITU-R 468: the network of Rec. ITU-R BS.468-4, Fig. 1a, set to 0 dB at 1 kHz, so that a 1 kHz sine reads its level.
"""

from math import sqrt

import numpy as np
from numpy.typing import ArrayLike, NDArray

from streamhost.filters.curves.analogue import CURVES

REFERENCE = 1000.0
LOW, HIGH, A_LOW = 10.0**1.5, 10.0**3.9, 10.0**2.45


def a_weighting(frequencies_hz: ArrayLike) -> NDArray[np.float64]:
    """|A|^2, 1 at 1 kHz, at frequencies in Hz of any shape."""
    f = np.asarray(frequencies_hz, dtype=np.float64)
    return np.asarray(_unscaled(f) / _unscaled(np.float64(REFERENCE)), dtype=np.float64)


def itu_468_weighting(frequencies_hz: ArrayLike) -> NDArray[np.float64]:
    """|H|^2 of the 468 curve, 1 at 1 kHz, at frequencies in Hz of any shape."""
    return np.square(np.abs(itu_468_response(frequencies_hz)))


def itu_468_response(frequencies_hz: ArrayLike) -> NDArray[np.complex128]:
    """H of the 468 curve, magnitude 1 at 1 kHz."""
    curve = CURVES["itu-r-468"]
    s, at = 2j * np.pi * np.asarray(frequencies_hz, dtype=np.float64), 2j * np.pi * REFERENCE
    ratio, reference = np.ones_like(s), complex(1.0)
    for zero in curve.zeros:
        ratio, reference = ratio * (s - zero), reference * (at - zero)
    for pole in curve.poles:
        ratio, reference = ratio / (s - pole) * abs(pole), reference / (at - pole) * abs(pole)
    return np.asarray(ratio / abs(reference))


def _pole_squares() -> tuple[float, float, float, float]:
    """f1^2, f2^2, f3^2, f4^2 (Formulas E.2 to E.5 of the standard)."""
    d = sqrt(0.5)
    c = LOW**2 * HIGH**2
    b = (REFERENCE**2 + c / REFERENCE**2 - d * (LOW**2 + HIGH**2)) / (1.0 - d)
    root = sqrt(b * b - 4.0 * c)
    inner = [((3.0 + sign * sqrt(5.0)) / 2.0 * A_LOW) ** 2 for sign in (-1, 1)]
    return (-b - root) / 2.0, inner[0], inner[1], (-b + root) / 2.0


_F1, _F2, _F3, _F4 = _pole_squares()


def _unscaled(f: NDArray[np.float64] | np.float64) -> NDArray[np.float64] | np.float64:
    square = f * f
    return square**4 / ((square + _F1) ** 2 * (square + _F2) * (square + _F3) * (square + _F4) ** 2)
