"""The spectrum of one window, the noise in it, and what stands out of that noise."""

from dataclasses import dataclass
from functools import lru_cache
from math import log, sqrt

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.bands import audio_band, bin_shares
from streamhost.measure.levels import decibels

FloatArray = NDArray[np.float64]

HALF_LINE = 1
"""A coherent tone under a Hann window lies in its bin and this many to either side, and in no other."""

AROUND = 300
"""Bins to either side from which the noise is told: their median."""

MEDIAN = log(2.0)
"""Of a power that is a chi-square variable of two degrees of freedom, over its mean."""

OVERLAP = 2.0 * (4.0 / 9.0 + 1.0 / 36.0)
"""By so much a Hann window's neighbouring bins correlate, summed: they count as fewer."""

FALSE_ALARM = 1e-3
LEAST = 1e-30
"""Of the power of all: float64 and its transform hold nothing below."""


@dataclass(frozen=True, eq=False)
class Periodogram:
    """Power by bin of one Hann window, (bins,), in full scale squared; the sum is the whole power, and that of a coherent
    tone its three bins."""

    power: FloatArray
    rate: float
    frames: int

    @property
    def spacing(self) -> float:
        """Between bins, in Hz."""
        return self.rate / self.frames

    @property
    def frequencies(self) -> FloatArray:
        return np.asarray(np.arange(len(self.power)) * self.spacing, dtype=np.float64)

    def line(self, bin: int, half: int = HALF_LINE) -> float:
        """The power of a bin and `half` more to either side."""
        return float(self.power[max(bin - half, 0) : bin + half + 1].sum())

    def without(self, bin: int | None) -> "Periodogram":
        """The same but for 0 Hz and a fundamental's bins."""
        rest = self.power.copy()
        rest[: HALF_LINE + 1] = 0.0
        if bin is not None:
            rest[max(bin - HALF_LINE, 0) : bin + HALF_LINE + 1] = 0.0
        return Periodogram(rest, self.rate, self.frames)


@lru_cache(maxsize=4)
def _window(frames: int) -> FloatArray:
    return np.asarray(0.5 - 0.5 * np.cos(2.0 * np.pi * np.arange(frames) / frames), dtype=np.float64)


def periodogram(samples: FloatArray, rate: float) -> Periodogram:
    """Of one window, (frames,), an odd number of them."""
    window = _window(len(samples))
    power = 2.0 * np.abs(np.fft.rfft(samples * window)) ** 2 / (len(samples) * (window @ window))
    power[0] /= 2.0
    return Periodogram(np.where(power < LEAST * power.sum(), 0.0, power), rate, len(samples))


def audio_shares(spectrum: Periodogram) -> FloatArray:
    """How much of each bin lies in the audio band, (bins,); all of it where the rate has no such band."""
    band = audio_band(spectrum.rate) or (0.0, spectrum.rate / 2.0)
    return bin_shares(len(spectrum.power), spectrum.spacing, band)


def noise_floor(spectrum: Periodogram, shape: FloatArray | None = None) -> FloatArray:
    """The mean power of the noise by bin, (bins,): of 601 bins the median, made flat by the `shape` expected of noise."""
    from scipy.ndimage import median_filter

    expected = np.ones(len(spectrum.power)) if shape is None else shape
    flat = spectrum.power / expected
    flat[: HALF_LINE + 1] = flat[HALF_LINE + 1 : 2 * HALF_LINE + 3].mean()
    around = median_filter(flat, size=2 * AROUND + 1, mode="reflect")
    return np.asarray(np.maximum(around / MEDIAN * expected, LEAST * spectrum.power.sum()), dtype=np.float64)


def alarm(tests: int, false_alarm: float = FALSE_ALARM) -> float:
    """How many times the noise's mean a bin must hold, that noise alone shows such a one among `tests` bins with no more
    than this chance.

    A bin of noise is a chi-square variable of two degrees of freedom, P(power > t mean) = exp(-t), and a bound for all is
    the sum. The median that tells the mean scatters by s itself, about normally, which makes it exp(-t + (t s)^2 / 2).
    """
    wanted = log(tests / false_alarm)
    independent = (2 * AROUND + 1) / (1.0 + OVERLAP)
    square = 1.0 / (MEDIAN**2 * independent)
    return (1.0 - sqrt(max(0.0, 1.0 - 2.0 * square * wanted))) / square


def expected_largest(tests: int) -> float:
    """The median of the largest of so many bins of noise, over the noise's mean."""
    return log(tests / MEDIAN)


def over_median_db(times_mean: float) -> float:
    """A multiple of the noise's mean as decibels over its median."""
    return decibels(times_mean / MEDIAN)
