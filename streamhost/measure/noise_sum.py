"""The noise of a realization: what it puts out minus what its ideal does, counted as the standard meters count.

Given as dBFS, the power of all channels averaged. The mean is taken out and told apart.
"""

from dataclasses import dataclass, field
from math import isfinite

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.bands import Band, audio_band, bin_shares
from streamhost.measure.counting import Counting, stretches
from streamhost.measure.interval import degrees_of_freedom, half_width_db
from streamhost.measure.levels import has_run_away, power_dbfs
from streamhost.measure.moments import Moments
from streamhost.measure.weighting import a_weighting, itu_468_weighting
from streamhost.measure.welch import Spectrum, SpectrumSum, mean_spectrum, segment_lengths

MOST_EXCLUDED = 0.01
LEAST_SETTLING = 64
ENOUGH_SEEN = 0.5


@dataclass(frozen=True)
class Noise:
    """What was measured; a figure is None where it cannot be given, and `reason` then says why.

    dbfs: 20 Hz to the lower of 20 kHz and half the rate; full_dbfs: 0 to half the rate; a_dbfs and rms_468_dbfs: in the
    band of dbfs through the curves A and 468. interval_db: how far the 95 % interval reaches from dbfs, to the side where
    it reaches further. mean: of the channel where it is largest in magnitude, 1.0 = full scale. excluded: share of the
    frames after the settling time that lie within it from an overflow on. spectrum: of all channels, unweighted.
    """

    dbfs: float | None
    interval_db: float | None
    full_dbfs: float | None
    a_dbfs: float | None
    rms_468_dbfs: float | None
    mean: float | None
    excluded: float
    reason: str = ""
    spectrum: Spectrum | None = field(default=None, compare=False, repr=False)


def settling_of_run(settling: float, frames: int) -> int:
    """Frames to wait in a run of so many: at least 64, and at most half of the run."""
    return int(min(max(settling, LEAST_SETTLING), frames // 2))


class NoiseSum:
    """The noise of a run of a known length, block after block. Memory does not grow with the length.

    `settling`: frames after which the start, and an overflow, are forgotten (infinite: no figure will be given).
    """

    def __init__(self, rate: float, frames: int, channels: int, settling: float) -> None:
        self._rate, self._settles = rate, isfinite(settling)
        wait = settling_of_run(settling, frames)
        self._counting = [Counting(wait) for _ in range(channels)]
        self._moments = [Moments() for _ in range(channels)]
        self._lengths = segment_lengths(rate, frames - wait, wait)
        self._spectra = [[SpectrumSum(rate, length) for length in self._lengths] for _ in range(channels)]
        self._ran_away = False

    def add(self, difference: NDArray[np.float64], marks: NDArray[np.uint8]) -> None:
        """The next block: realized minus ideal, and where something overflowed, each (frames, channels)."""
        self._ran_away = self._ran_away or has_run_away(difference)
        if self._ran_away:
            return
        for channel, counting in enumerate(self._counting):
            counts = counting.take(marks[:, channel])
            self._add_channel(channel, np.ascontiguousarray(difference[:, channel]), counts)

    def _add_channel(self, channel: int, difference: NDArray[np.float64], counts: NDArray[np.bool_]) -> None:
        self._moments[channel].add(difference[counts])
        for spectrum in self._spectra[channel]:
            end = 0
            for first, last in stretches(counts):
                if first > end:
                    spectrum.gap()
                spectrum.add(difference[first:last])
                end = last
            if end < len(difference):
                spectrum.gap()

    def result(self) -> Noise:
        """The figures of all that has come."""
        settled = sum(counting.settled for counting in self._counting)
        excluded = sum(counting.excluded for counting in self._counting) / settled if settled else 0.0
        if reason := self._why_none(excluded):
            return Noise(None, None, None, None, None, None, excluded, reason)
        full = power_dbfs(float(np.mean([moments.variance for moments in self._moments if moments.count])))
        mean = max((moments.mean for moments in self._moments), key=abs)
        band = audio_band(self._rate)
        if band is None:
            return Noise(None, None, full, None, None, mean, excluded, "half the rate is below 20 Hz, where the band begins")
        return self._in_band(band, full, mean, excluded)

    def _why_none(self, excluded: float) -> str:
        if self._ran_away:
            return "the output or the ideal runs away: it is no longer finite, or beyond what a file holds"
        if not self._settles:
            return "with its coefficients rounded the filter does not settle, and what it puts out is not only noise"
        if excluded > MOST_EXCLUDED:
            return f"{100 * excluded:.1f} % of the frames lie within the settling time of an overflow, more than 1 %"
        if not self._lengths:
            return "the run is too short"
        if not any(spectrum.segments for channel in self._spectra for spectrum in channel):
            return f"no {self._lengths[-1] / self._rate:.2g} s of the run are without an overflow"
        return ""

    def _spectrum(self) -> Spectrum:
        """The finest that saw enough of the run, or else the one that saw the most."""
        by_length = zip(*self._spectra, strict=True)
        spectra = [mean_spectrum([channel.spectrum() for channel in channels]) for channels in by_length]
        enough = ENOUGH_SEEN * max(moments.count for moments in self._moments)
        return next((fine for fine in spectra if fine.frames >= enough), max(spectra, key=lambda seen: seen.frames))

    def _in_band(self, band: Band, full: float, mean: float, excluded: float) -> Noise:
        spectrum = self._spectrum()
        shares = bin_shares(len(spectrum.power), spectrum.spacing, band)
        power = float(spectrum.power @ shares)
        a, by_468 = (power_dbfs(float(spectrum.power @ (shares * weighting(spectrum.frequencies))))
                     for weighting in (a_weighting, itu_468_weighting))
        interval = half_width_db(degrees_of_freedom(spectrum, shares)) if power else None
        return Noise(power_dbfs(power), interval, full, a, by_468, mean, excluded, spectrum=spectrum)


def noise_of(difference: NDArray[np.float64], rate: float, settling: float = 0.0) -> Noise:
    """The noise in a difference (frames, channels) without overflows, as `NoiseSum` measures it."""
    sums = NoiseSum(rate, len(difference), difference.shape[1], settling)
    sums.add(difference, np.zeros(difference.shape, np.uint8))
    return sums.result()
