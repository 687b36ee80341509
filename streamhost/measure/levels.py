"""Powers and peaks as decibels: 0 dBFS is a full-scale sine (AES17-2015, 3.12.1; IEC 61606-3:2008, 3.4)."""

from math import inf, log10

import numpy as np
from numpy.typing import NDArray

LARGEST = float(np.finfo(np.float32).max)
"""What a file of 32-bit floats holds; a signal beyond it has run away."""


def decibels(power_ratio: float) -> float:
    """10 lg of a ratio of powers; minus infinity for 0."""
    return 10.0 * log10(power_ratio) if power_ratio > 0.0 else -inf


def power_dbfs(power: float) -> float:
    """A mean square, in units of full scale squared, as dBFS: the rms plus 3.01 dB."""
    return decibels(2.0 * power)


def peak_dbfs(peak: float) -> float:
    """The largest magnitude of a sample as dBFS: that of a full-scale sine, 1.0, is 0."""
    return 20.0 * log10(peak) if peak > 0.0 else -inf


def has_run_away(samples: NDArray[np.float64]) -> bool:
    """Whether a sample is not a number or beyond what a file holds. Squares and sums of all others are finite."""
    return not (np.abs(samples) <= LARGEST).all()
