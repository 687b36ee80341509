"""A curve by the plain bilinear transform: exact at 0 Hz, bent more and more towards half the rate.

At 48 kHz A and C weighting keep class 1, whose lower limits are wide there; ITU-R 468 leaves its limits from 7.1 kHz on
(from 10 kHz at 96 kHz), and phono replay and FM de-emphasis are off by 0.1 dB from 4 to 5 kHz on.
"""

from streamhost.filters.curves.analogue import Curve, Roots
from streamhost.filters.filter import Filter


def transformed(curve: Curve, rate: float) -> Filter:
    """z = (2 rate + s) / (2 rate - s) for each root, without prewarping; zeros at infinity come to z = -1 exactly."""
    zeros = [*_moved(curve.zeros, rate), *[-1 + 0j] * (len(curve.poles) - len(curve.zeros))]
    return gained(zeros, _moved(curve.poles, rate), curve, rate)


def gained(zeros: list[complex], poles: list[complex], curve: Curve, rate: float) -> Filter:
    """The filter with these roots and the curve's gain at its reference frequency."""
    unscaled = Filter.from_zeros_poles(zeros, poles, 1.0, rate=rate)
    gain = 10 ** (curve.reference_db / 20) / abs(complex(unscaled.response(curve.reference_hz)))
    return Filter.from_zeros_poles(zeros, poles, gain, rate=rate)


def _moved(roots: Roots, rate: float) -> list[complex]:
    """Conjugates stay exact conjugates: only the upper root is transformed."""
    upper = [(2 * rate + root) / (2 * rate - root) for root in roots if root.imag > 0]
    real = [complex((2 * rate + root.real) / (2 * rate - root.real)) for root in roots if root.imag == 0]
    return [*upper, *(root.conjugate() for root in upper), *real]
