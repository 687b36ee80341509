"""Averaged spectra of signals that come in pieces: P. D. Welch, IEEE Trans. AU-15 (1967).

Hann windows at half overlap. Memory is that of one segment, however long the signal is.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

FINEST_HZ = 0.4
"""No bin is narrower: 20 Hz is then more than 50 bins from 0 Hz, and longer segments would only take memory."""

COARSEST_HZ = 6.0
"""No bin is wider where the signal allows it: a Hann window keeps a constant out of all bins from 2 on."""

DETAIL = 32
"""Segments this much longer than the noise takes to die out: its spectrum has no narrower detail."""

LEAST_SEGMENTS = 4
LEAST_LENGTH = 64


@dataclass(frozen=True, eq=False)
class Spectrum:
    """Power by bin, (bins,) from 0 to half the rate, in units of full scale squared; the sum is the whole power.

    `frames`: how many frames of a constant window would scatter as little (0: no segment was complete).
    `scatter`: variance of a bin over its square.
    """

    power: FloatArray
    spacing: float
    frames: float
    scatter: float

    @property
    def frequencies(self) -> FloatArray:
        """Of the bins, in Hz."""
        return np.asarray(np.arange(len(self.power)) * self.spacing, dtype=np.float64)


def segment_lengths(rate: float, frames: int, settling: float) -> tuple[int, ...]:
    """Frames of a segment, even, in a run of so many frames: as fine as is of use, then, if that is shorter, as the
    noise's own detail needs, for a run that is often broken off. None for a run that is too short."""
    coarsest, finest = _power_of_two(rate / COARSEST_HZ), _power_of_two(rate / FINEST_HZ)
    most = max(frames // LEAST_SEGMENTS, min(frames, coarsest))
    needed = max(coarsest, _power_of_two(DETAIL * settling))
    lengths = {length - length % 2 for length in (min(finest, most), min(needed, finest, most))}
    return tuple(sorted((length for length in lengths if length >= LEAST_LENGTH), reverse=True))


def _power_of_two(least: float) -> int:
    return 1 << int(np.ceil(np.log2(max(1.0, least))))


class SpectrumSum:
    """The spectrum of one channel, from pieces given one after the other; `gap` says that the next does not adjoin."""

    def __init__(self, rate: float, length: int) -> None:
        assert length >= LEAST_LENGTH and length % 2 == 0, "segments are even and not too short"
        self._rate, self._length = rate, length
        self._window = 0.5 - 0.5 * np.cos(2.0 * np.pi * np.arange(length) / length)
        self._sum = np.zeros(length // 2 + 1)
        self._pending = np.zeros(0)
        self.segments = self._overlaps = 0
        self._continues = False

    def add(self, piece: FloatArray) -> None:
        """The next frames, (frames,)."""
        pending = np.concatenate((self._pending, piece))
        start = 0
        while len(pending) - start >= self._length:
            self._take(pending[start : start + self._length])
            start += self._length // 2
        self._pending = pending[start:].copy()

    def gap(self) -> None:
        """What comes next does not adjoin what came."""
        self._pending = np.zeros(0)
        self._continues = False

    def _take(self, segment: FloatArray) -> None:
        centred = segment - self._window @ segment / self._window.sum()
        self._sum += np.abs(np.fft.rfft(centred * self._window)) ** 2
        self.segments += 1
        self._overlaps += self._continues
        self._continues = True

    def spectrum(self) -> Spectrum:
        """What has come so far."""
        spacing = self._rate / self._length
        if not self.segments:
            return Spectrum(self._sum.copy(), spacing, 0.0, 0.0)
        squares = self._window**2
        one_sided = np.full(len(self._sum), 2.0)
        one_sided[[0, -1]] = 1.0
        power = one_sided * self._sum / (self.segments * self._length * squares.sum())
        return Spectrum(power, spacing, self._effective_frames(squares), self._scatter())

    def _effective_frames(self, squares: FloatArray) -> float:
        """(sum u)^2 / sum u^2, u the weight with which each frame enters."""
        half = self._length // 2
        weight = self.segments * squares.sum()
        square = self.segments * (squares @ squares) + 2.0 * self._overlaps * (squares[:half] @ squares[half:])
        return float(weight**2 / square)

    def _scatter(self) -> float:
        """Of two overlapping Hann segments the powers correlate by 1/36 (Welch 1967)."""
        return (1.0 + 2.0 * self._overlaps / self.segments / 36.0) / self.segments


def mean_spectrum(spectra: list[Spectrum]) -> Spectrum:
    """The mean of the spectra of several channels.

    Channels may carry the same signal: their scatter is taken to be that of the one with the most frames.
    """
    heard = [spectrum for spectrum in spectra if spectrum.frames > 0.0]
    if not heard:
        return spectra[0]
    best = max(heard, key=lambda spectrum: spectrum.frames)
    power = np.mean([spectrum.power for spectrum in heard], axis=0)
    return Spectrum(power, best.spacing, best.frames, best.scatter)
