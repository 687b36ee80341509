"""One realization on one signal: everything that a comparison tells of it."""

from dataclasses import dataclass
from math import inf, isnan

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Counts
from streamhost.diagram.norms import settling_frames
from streamhost.formats import Fixed
from streamhost.measure.bands import Band
from streamhost.measure.deviation import Deviation, response_deviation
from streamhost.measure.levels import has_run_away, peak_dbfs
from streamhost.measure.noise_sum import Noise, NoiseSum, settling_of_run
from streamhost.measure.predicted import Density, Prediction
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
class Figures:
    """What was found at one output. Levels in dBFS; a figure that cannot be given is None, with the reason beside it.

    `peak_dbfs`: of the output. `dc_lsb`: the noise's mean in steps of the output's word, None in floating point.
    `difference_gain_db`: what brings the peak of the difference near -12 dBFS, in whole dB; None where there is no
    difference, or one that runs away. `channel`: where channels have coefficients of their own, the one, from 1, that
    noise, prediction and verdict are of, the worst; None where they are of all channels together.
    """

    name: str
    deviation: Deviation
    noise: Noise
    prediction: Prediction | None
    white: Whiteness
    dc_lsb: float | None
    peak_dbfs: float
    difference_gain_db: int | None
    channel: int | None = None


@dataclass(frozen=True)
class Measured:
    """What was found of a realization, and at each of its outputs; the properties are those of the first.

    `ideal`: the arithmetic of the ideal run. `sum_deviation`: how far the sum of several outputs is from the sum as asked;
    None of one.
    """

    outputs: tuple[Figures, ...]
    sum_deviation: Deviation | None
    unstable: int
    tally: Tally
    counts: Counts
    ns_per_frame: float
    ideal: str

    @property
    def deviation(self) -> Deviation:
        return self.outputs[0].deviation

    @property
    def noise(self) -> Noise:
        return self.outputs[0].noise

    @property
    def prediction(self) -> Prediction | None:
        return self.outputs[0].prediction

    @property
    def white(self) -> Whiteness:
        return self.outputs[0].white

    @property
    def dc_lsb(self) -> float | None:
        return self.outputs[0].dc_lsb

    @property
    def peak_dbfs(self) -> float:
        return self.outputs[0].peak_dbfs

    @property
    def difference_gain_db(self) -> int | None:
        return self.outputs[0].difference_gain_db


def block_length(frames: int, settling: float) -> int:
    """Frames of a block for a run of so many, so that enough blocks lie behind the settling time."""
    behind = frames - settling_of_run(settling, frames)
    block = LONGEST_BLOCK
    while block > SHORTEST_BLOCK and behind < (ENOUGH_BLOCKS + 1) * block:
        block //= 2
    return block


class Measurement:
    """Takes a signal of a known length block after block, then gives the result. Memory does not grow with the length.

    Blocks are of `block` frames, but for the last; the first `wait` frames do not count. An overflow anywhere disturbs all
    outputs. Raises RequestError for words at the doors that samples do not hold.
    """

    def __init__(self, realization: Realization, frames: int, channels: int, band: Band) -> None:
        self._realization, self._band = realization, band
        self._run = Run(realization, channels)
        diagram = realization.program.diagram
        settling = max(settling_frames(diagram, channel) for channel in range(diagram.channels))
        self.block = block_length(frames, settling)
        self._sums = [_OutputSum(realization, frames, channels, settling) for _ in realization.outputs]
        self.wait = settling_of_run(settling, frames)
        self._watch = watch(realization.program, self.wait, self.block)
        self._first: FloatArray | None = None

    def step(self, x: FloatArray) -> Block:
        """Measure the next block (frames, channels) and give it back."""
        if self._first is None:
            self._first = x.copy()
        block = self._run.step(x)
        self._watch.add(x, block.trace)
        for output, found in enumerate(self._sums):
            found.add(block.output[:, output], block.difference[:, output], block.marks)
        return block

    def result(self) -> Measured:
        """Everything that was found, after the last block."""
        assert self._first is not None, "a signal has at least one frame"
        realization, several = self._realization, range(len(self._sums))
        adds_up = 1 < len(realization.filters[0].outputs) == len(several)
        return Measured(
            outputs=tuple(self._figures(output, name) for output, name in enumerate(realization.outputs)),
            sum_deviation=response_deviation(realization, self._band, several) if adds_up else None,
            unstable=realization.unstable,
            tally=self._run.tally(),
            counts=realization.program.drawn.counts(),
            ns_per_frame=ns_per_frame(realization, self._first),
            ideal=self._run.ideal.label,
        )

    def predicted_density(self, figures: Figures) -> Density:
        """Of an output and channel with figures: the predicted power, at radians a frame."""
        output = self._realization.outputs.index(figures.name)
        return self._watch.density(output, (figures.channel or 1) - 1)

    def _figures(self, output: int, name: str) -> Figures:
        realization, found = self._realization, self._sums[output]
        channel, noise = found.worst()
        return Figures(
            name=name,
            deviation=response_deviation(realization, self._band, (output,)),
            noise=noise,
            prediction=None if found.ran_away else self._watch.prediction(realization.rate, output, channel),
            white=self._white(noise, output, channel),
            dc_lsb=_in_steps(noise.mean, realization) if isinstance(realization.format, Fixed) else None,
            peak_dbfs=peak_dbfs(found.peak),
            difference_gain_db=None if found.ran_away else listening_gain(found.difference_peak),
            channel=channel + 1 if realization.diagram.channels > 1 else None,
        )

    def _white(self, noise: Noise, output: int, channel: int) -> Whiteness:
        """The verdict, where there is a noise for the model to be one of."""
        if self._realization.unstable:
            return Whiteness(None, f"the filter is not stable {self._realization.unstable_since}")
        if noise.dbfs is None:
            return Whiteness(None, "there is no noise figure")
        return self._watch.verdict(self._realization.rate, output, channel)


class _OutputSum:
    """What is summed up of one output. Where channels have coefficients of their own, each has its noise."""

    def __init__(self, realization: Realization, frames: int, channels: int, settling: float) -> None:
        columns = realization.diagram.channels
        groups = [slice(channel, channel + 1) for channel in range(columns)] if columns > 1 else [slice(channels)]
        self._noises = [(group, NoiseSum(realization.rate, frames, channels // columns, settling)) for group in groups]
        self.peak = self.difference_peak = 0.0
        self.ran_away = False

    def add(self, output: FloatArray, difference: FloatArray, marks: NDArray[np.uint8]) -> None:
        for group, noise in self._noises:
            noise.add(difference[:, group], marks[:, group])
        self.peak = max(self.peak, _largest(output))
        self.difference_peak = max(self.difference_peak, _largest(difference))
        self.ran_away = self.ran_away or has_run_away(difference)

    def worst(self) -> tuple[int, Noise]:
        """The channel with the most noise, or without a figure, and that noise."""
        results = [noise.result() for _, noise in self._noises]
        levels = [inf if result.dbfs is None else result.dbfs for result in results]
        channel = levels.index(max(levels))
        return channel, results[channel]


def measure(realization: Realization, x: FloatArray, band: Band) -> Measured:
    """A whole signal (frames, channels) through a realization."""
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


def listening_gain(peak: float) -> int | None:
    """Whole dB, at most 150, that bring a peak to -12 dBFS or just below; negative where it is louder."""
    if peak == 0.0:
        return None
    return min(MOST_RAISED_DB, int(np.floor(LISTENING_DBFS - peak_dbfs(peak))))
