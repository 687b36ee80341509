"""The quasi-peak meter of Rec. ITU-R BS.468-4 behind its weighting curve.

A rectifier and two capacitors, each quickly charged through a resistor and slowly discharged through another. The rates are
fitted for this project to the meter's readings of bursts of 5 kHz (Tables 2 and 3 of the recommendation, from memory):
they are read within 0.2 dB, where 1.3 dB and more are allowed.
"""

import ctypes
from functools import cache
from math import sqrt

import numpy as np
from numpy.typing import NDArray

from streamhost.cache import load_module
from streamhost.measure.weighting import itu_468_response

FloatArray = NDArray[np.float64]

CHARGING = (678.0, 4.297)
DISCHARGING = (3.498, 2.902)
"""Of the two capacitors, each a second."""

RING_OUT = 0.05
"""Seconds after which the curve has forgotten its input: its lowest corner is at 4.1 kHz, and 0 Hz is blocked."""

STEADY = 3.0
"""Seconds of a sine after which a reading stands: the slowest rate is 4.3 + 2.9 a second."""


_TEXT = '''"""The highest reading of the quasi-peak meter on each column."""

import numpy as np
from numba import carray, cfunc, types

reals = types.CPointer(types.float64)


@cfunc(types.void(reals, reals, reals, types.int64, types.int64), cache=CACHE, error_model="numpy")
def kernel(x_, rates_, highest_, frames, columns):
    x, rates, highest = carray(x_, (frames, columns)), carray(rates_, 4), carray(highest_, columns)
    for c in range(columns):
        first, second, most = 0.0, 0.0, 0.0
        for n in range(frames):
            level = abs(x[n, c])
            first *= rates[2]
            if level > first:
                first += rates[0] * (level - first)
            second *= rates[3]
            if first > second:
                second += rates[1] * (first - second)
            most = max(most, second)
        highest[c] = most
'''
_SIGNATURE = ctypes.CFUNCTYPE(None, *([ctypes.c_void_p] * 3), ctypes.c_int64, ctypes.c_int64)


def weighted_468(x: FloatArray, rate: float) -> FloatArray:
    """A signal (frames, ...) through the network of the recommendation, 0 dB at 1 kHz, as long."""
    from scipy.fft import irfft, next_fast_len, rfft

    length = next_fast_len(len(x) + round(RING_OUT * rate), real=True)
    response = itu_468_response(np.arange(length // 2 + 1) * rate / length)
    spectrum = rfft(x, length, axis=0) * response.reshape(-1, *(1,) * (x.ndim - 1))
    return np.asarray(irfft(spectrum, length, axis=0)[: len(x)])


def quasi_peak(x: FloatArray, rate: float) -> float:
    """The highest reading on a signal (frames,) that is weighted already; of a steady 1 kHz sine its rms."""
    return float(quasi_peaks(x[:, None], rate)[0])


def quasi_peaks(x: FloatArray, rate: float) -> FloatArray:
    """That of each column of (frames, columns)."""
    return _highest(x, rate) * _sine_factor(rate)


def _highest(x: FloatArray, rate: float) -> FloatArray:
    rates = np.array([*(-np.expm1(-each / rate) for each in CHARGING), *(np.exp(-each / rate) for each in DISCHARGING)])
    given, highest = np.ascontiguousarray(x, np.float64), np.zeros(x.shape[1])
    kernel = load_module(_TEXT, "quasi-peak meter").kernel
    _SIGNATURE(kernel.address)(given.ctypes.data, rates.ctypes.data, highest.ctypes.data, *given.shape)
    return highest


@cache
def _sine_factor(rate: float) -> float:
    """The rms of a 1 kHz sine over what the capacitors come to on it."""
    sine = np.sin(2.0 * np.pi * 1000.0 / rate * np.arange(round(STEADY * rate)))
    return sqrt(0.5) / float(_highest(sine[:, None], rate)[0])


def quasi_peak_power(x: FloatArray, rate: float) -> float:
    """The square of the highest reading behind the curve, so that a steady 1 kHz sine reads its mean square."""
    return quasi_peak(weighted_468(x, rate), rate) ** 2
