"""Spectra of the last of what was heard, of what the heard lane adds, and of what theory predicts: dBFS in each bin."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Fixed
from streamhost.measure import predicted_noise
from streamhost.measure.levels import power_dbfs
from streamhost.program.sources import noise_spectrum
from streamhost.realization import Realization

POINTS, MEAN = 2048, 8
FRAMES = POINTS // 2 * (MEAN + 1)
"""Of a mean of so many pieces, each half over the one before."""

LOWEST_DB = -220.0
WINDOW = np.hanning(POINTS + 1)[:-1]
FULL_SCALE = 4.0 / WINDOW.sum() ** 2
"""A sine of full scale reads 0 dB in its bin."""

Floats = NDArray[np.float64]


def recent(ring: Floats, frame: int, frames: int, block: int) -> Floats:
    """The last frames before `frame`, counted from the first of the run, less a block that may be being written.

    Zeros stand for what was before the first.
    """
    length = len(ring)
    last = max(frame - block, 0)
    frames = min(frames, length - 2 * block)
    rows = np.arange(last - frames, last)
    found = ring[rows % length].copy()
    found[rows < 0] = 0.0
    return found


def spectrum(signal: Floats) -> Floats:
    """Of a signal of FRAMES: (POINTS / 2 + 1,) dBFS, Hann, the mean of MEAN pieces' powers."""
    pieces = np.lib.stride_tricks.sliding_window_view(np.nan_to_num(signal, posinf=0.0, neginf=0.0), POINTS)[:: POINTS // 2]
    power = (np.abs(np.fft.rfft(pieces * WINDOW, axis=-1)) ** 2).mean(axis=0)
    return np.asarray(10.0 * np.log10(np.maximum(power * FULL_SCALE, 10.0 ** (LOWEST_DB / 10.0))), np.float64)


def noise_dbfs(added: Floats) -> float:
    """What a lane adds, (frames, columns), without its mean: rms of all columns, as dBFS."""
    return power_dbfs(float(np.nan_to_num(added).var(axis=0).mean()))


@dataclass(frozen=True, eq=False)
class Theory:
    """What is predicted of a fixed-point lane; nothing of one in floating point, whose noise depends on the signal."""

    realization: Realization

    @cached_property
    def dbfs(self) -> float | None:
        """From 0 to half the rate."""
        if not isinstance(self.realization.format, Fixed):
            return None
        return predicted_noise(self.realization.program, self.realization.rate).full_dbfs

    @cached_property
    def third_octaves(self) -> list[tuple[float, float]]:
        """(Hz, dBFS in a bin of a spectrum) at the exact third octaves of ISO 266 from 20 Hz to 20 kHz."""
        rate = self.realization.rate
        if not isinstance(self.realization.format, Fixed):
            return []
        places = np.array([1000.0 * 10.0 ** (k / 10.0) for k in range(-17, 14)])
        places = places[places < rate / 2.0]
        power = noise_spectrum(self.realization.program, 2.0 * np.pi * places / rate, 0, 0)
        level = 10.0 * np.log10(np.maximum(power * (WINDOW**2).sum() * FULL_SCALE, 10.0 ** (LOWEST_DB / 10.0)))
        return [(float(place), float(each)) for place, each in zip(places, level, strict=True)]
