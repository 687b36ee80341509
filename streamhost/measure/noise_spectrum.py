"""Spectra averaged over parts of an octave, as ears and figures have them."""

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

LOWEST_THIRD, HIGHEST_THIRD = -17, 13


def averaged(hertz: FloatArray, dbfs: FloatArray, parts: int) -> tuple[FloatArray, FloatArray]:
    """Of a density in dBFS at hertz that rise from above 0: mean frequency and mean power of each part of an octave."""
    place = np.round(parts * np.log2(hertz)).astype(np.int64)
    _, group, count = np.unique(place, return_inverse=True, return_counts=True)
    power = np.bincount(group, 10.0 ** (dbfs / 10.0)) / count
    with np.errstate(divide="ignore"):
        return np.exp2(np.bincount(group, np.log2(hertz)) / count), np.asarray(10.0 * np.log10(power))


def third_octaves(highest: float) -> FloatArray:
    """Mid-band frequencies in Hz from 20 Hz to the lower of 20 kHz and `highest` (IEC 61260-1:2014, base ten)."""
    hertz = 1000.0 * 10.0 ** (np.arange(LOWEST_THIRD, HIGHEST_THIRD + 1) / 10.0)
    return np.asarray(hertz[hertz <= highest])
