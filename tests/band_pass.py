"""The elliptic band-pass of order 12 that several tests of structures take, and the noise of its sections."""

import math

import numpy as np
from scipy import signal

from streamhost.filters import Filter, Polynomials, design


def elliptic_band_pass() -> Filter:
    """Oppenheim & Schafer, ch. 6 (from memory): between 0.99 and 1.01 in the pass-band, 0.01 in the stop-band.

    In dB 0.173724 and 40.0864, here to all digits.
    """
    return design(
        "elliptic", rate=2.0, response="band-pass", order=6, frequency=(0.3, 0.4),
        ripple_db=20 * math.log10(1.01 / 0.99), stopband_db=20 * math.log10(1.01 / 0.01),
    )


def noise_gain(sections: tuple[Polynomials, ...]) -> float:
    """dB of the sum over sections of the power gain of 1 / A_k times all later sections."""
    power = 0.0
    for k, section in enumerate(sections):
        h = signal.lfilter([1.0], section.a, np.eye(1, 3000)[0])
        for later in sections[k + 1 :]:
            h = signal.lfilter(later.b, later.a, h)
        power += float(np.sum(h * h))
    return 10 * math.log10(power)
