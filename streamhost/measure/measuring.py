"""One realization on one signal: everything that a comparison tells of it."""

from dataclasses import dataclass
from math import inf, isnan

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Counts
from streamhost.diagram.norms import settling_frames
from streamhost.formats import Fixed
from streamhost.measure.bands import Band
from streamhost.measure.levels import has_run_away, peak_dbfs
from streamhost.measure.noise import Noise, NoiseSum, settling_of_run
from streamhost.measure.predicted import Prediction
from streamhost.measure.response import Deviation, response_deviation
from streamhost.measure.running import Block, Run
from streamhost.measure.timing import ns_per_frame
from streamhost.measure.watching import watch
from streamhost.measure.whiteness import Whiteness
from streamhost.realization import Realization, Tally

FloatArray = NDArray[np.float64]

LONGEST_BLOCK, SHORTEST_BLOCK = 1 << 15, 1 << 10
ENOUGH_BLOCKS = 8

LISTENING_DBFS = -12.0
MOST_RAISED_DB = 150


@dataclass(frozen=True)
class Measured:
    """What was found. Levels in dBFS; a figure that cannot be given is None, with the reason beside it.

    `ideal`: the arithmetic of the ideal run. `peak_dbfs`: of the output. `dc_lsb`: the noise's mean in steps of the
    output's word, None in floating point. `difference_gain_db`: what brings the peak of the difference near -12 dBFS,
    in whole dB; None where there is no difference, or one that runs away.
    """

    deviation: Deviation
    unstable: int
    noise: Noise
    prediction: Prediction | None
    white: Whiteness
    dc_lsb: float | None
    peak_dbfs: float
    difference_gain_db: int | None
    tally: Tally
    counts: Counts
    ns_per_frame: float
    ideal: str


def block_length(frames: int, settling: float) -> int:
    """Frames of a block for a run of so many, so that enough blocks lie behind the settling time."""
    behind = frames - settling_of_run(settling, frames)
    block = LONGEST_BLOCK
    while block > SHORTEST_BLOCK and behind < (ENOUGH_BLOCKS + 1) * block:
        block //= 2
    return block


class Measurement:
    """Takes a signal of a known length block after block, then gives the result. Memory does not grow with the length.

    Blocks are of `block` frames, but for the last. Raises RequestError for a realization with several outputs.
    """

    def __init__(self, realization: Realization, frames: int, channels: int, band: Band) -> None:
        self._realization, self._band = realization, band
        self._run = Run(realization, channels)
        settling = settling_frames(realization.program.diagram)
        self.block = block_length(frames, settling)
        self._noise = NoiseSum(realization.filter.rate, frames, channels, settling)
        self._watch = watch(realization.program, frames, settling_of_run(settling, frames), self.block)
        self._peak = self._difference_peak = 0.0
        self._ran_away = False
        self._first: FloatArray | None = None

    def step(self, x: FloatArray) -> Block:
        """Measure the next block (frames, channels) and give it back."""
        if self._first is None:
            self._first = x.copy()
        block = self._run.step(x)
        self._noise.add(block.difference, block.marks)
        self._watch.add(x, block.trace)
        self._peak = max(self._peak, _largest(block.output))
        self._difference_peak = max(self._difference_peak, _largest(block.difference))
        self._ran_away = self._ran_away or has_run_away(block.difference)
        return block

    def result(self) -> Measured:
        """Everything that was found, after the last block."""
        assert self._first is not None, "a signal has at least one frame"
        realization, noise = self._realization, self._noise.result()
        fixed = isinstance(realization.format, Fixed)
        return Measured(
            deviation=response_deviation(realization, self._band),
            unstable=realization.unstable,
            noise=noise,
            prediction=None if self._ran_away else self._watch.prediction(realization.filter.rate),
            white=self._white(noise),
            dc_lsb=_in_steps(noise.mean, realization) if fixed else None,
            peak_dbfs=peak_dbfs(self._peak),
            difference_gain_db=None if self._ran_away else _listening_gain(self._difference_peak),
            tally=self._run.tally(),
            counts=realization.program.drawn.counts(),
            ns_per_frame=ns_per_frame(realization, self._first),
            ideal=self._run.ideal.label,
        )

    def _white(self, noise: Noise) -> Whiteness:
        """The verdict, where there is a noise for the model to be one of."""
        if self._realization.unstable:
            return Whiteness(None, "with its coefficients rounded the filter is not stable")
        if noise.dbfs is None:
            return Whiteness(None, "there is no noise figure")
        return self._watch.verdict(self._realization.filter.rate)


def measure(realization: Realization, x: FloatArray, band: Band) -> Measured:
    """A whole signal (frames, channels) through a realization. Raises RequestError as `Measurement` does."""
    frames, channels = x.shape
    measurement = Measurement(realization, frames, channels, band)
    for start in range(0, len(x), measurement.block):
        measurement.step(x[start : start + measurement.block])
    return measurement.result()


def _largest(samples: FloatArray) -> float:
    """The largest magnitude; infinite where a sample is NaN."""
    largest = float(np.abs(samples).max())
    return inf if isnan(largest) else largest


def _in_steps(mean: float | None, realization: Realization) -> float | None:
    assert isinstance(realization.format, Fixed), "a word has steps"
    return None if mean is None else mean * 2.0**realization.format.output.word.fraction


def _listening_gain(peak: float) -> int | None:
    """Whole dB, at most 150, that bring a peak to -12 dBFS or just below; negative where it is louder."""
    if peak == 0.0:
        return None
    return min(MOST_RAISED_DB, int(np.floor(LISTENING_DBFS - peak_dbfs(peak))))
