"""What a traced kernel writes: the residues of fixed point, by which the white model is judged, and the power of every
value in floating point, by which its noise is estimated."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Fixed
from streamhost.measure.naming import rounding_name
from streamhost.measure.predicted import Density, Prediction, predicted_density, predicted_noise, source_shares
from streamhost.measure.residues import ResidueSum, octave_edges
from streamhost.measure.whiteness import LEAST_SHARE, Expected, Whiteness, judged
from streamhost.program.program import Program, RoundArithmetic
from streamhost.program.sources import Source, noise_sources, traced_roundings

FloatArray = NDArray[np.float64]

class FixedWatch:
    """The residues of a fixed-point program in a run, of which the first `wait` frames do not count and all others do.

    Channels with coefficients of their own drop other values than the rest, and are judged apart.
    """

    def __init__(self, program: Program, wait: int, block: int) -> None:
        self._program, self._wait, self._frame = program, wait, 0
        self._columns = [_ColumnWatch(program, column, block) for column in range(program.diagram.channels)]

    def add(self, x: FloatArray, trace: FloatArray) -> None:
        """The next block: the input (frames, channels) and the trace (frames, channels, columns)."""
        settled = slice(max(0, self._wait - self._frame), None)
        if self._wait < self._frame + len(x):
            for channel in range(x.shape[1]):
                column = self._columns[min(channel, len(self._columns) - 1)]
                column.add(x[settled, channel], trace[settled, channel], channel)
        self._frame += len(x)

    def verdict(self, rate: float, output: int = 0, channel: int = 0) -> Whiteness:
        """Whether the white model holds at that rate at an output, each rounding judged by its part in the noise there.

        `channel`: with coefficients of its own; 0 where all are alike.
        """
        return self._columns[channel].verdict(rate, output)

    def prediction(self, rate: float, output: int = 0, channel: int = 0) -> Prediction:
        return predicted_noise(self._program, rate, output=output, channel=channel)

    def density(self, output: int = 0, channel: int = 0) -> Density:
        """Of the predicted power, at radians a frame."""
        return predicted_density(self._program, output=output, channel=channel)


class _ColumnWatch:
    """The residues of the channels that have the coefficients of one column."""

    def __init__(self, program: Program, column: int, block: int) -> None:
        self._program, self._column = program, column
        self._sources = noise_sources(program, column)
        self._columns, self._expected, _ = _watched(program, self._sources)
        self._sum = ResidueSum(np.array([rounding.lowest for rounding in self._expected]), block)
        self._seen = False

    def add(self, x: FloatArray, trace: FloatArray, channel: int) -> None:
        """A block of one channel: the input (frames,) and the trace (frames, columns)."""
        if self._expected:
            self._sum.add(x, trace[:, self._columns], channel)
            self._seen = True

    def verdict(self, rate: float, output: int) -> Whiteness:
        shares = source_shares(self._program, rate, np.pi * octave_edges(2), self._column, output)
        reaching = [k for k in range(len(self._sources)) if shares[:, k].any()]
        if not reaching:
            return Whiteness(None, "nothing is rounded")
        sources = tuple(self._sources[k] for k in reaching)
        if blind := _toward_zero(self._program, sources):
            return Whiteness(False, f"rounding toward zero follows the sign of the signal ({blind})")
        columns, expected, seen = _watched(self._program, sources)
        written = [reaching[k] for k in seen]
        if shares.sum() - shares[:, written].sum() >= LEAST_SHARE:
            inside = len(sources) - len(written)
            return Whiteness(None, f"{inside} of {len(sources)} errors arise inside sums, where none is written down")
        kept = [self._columns.index(column) for column in columns]
        weighed = tuple(replace(each, shares=tuple(shares[:, k])) for k, each in zip(written, expected, strict=True))
        return judged(weighed, self._sum.result().only(kept) if self._seen else None)


class FloatWatch:
    """The power of every value of a floating-point program; the first `wait` frames do not count."""

    def __init__(self, program: Program, wait: int) -> None:
        self._program, self._wait = program, wait
        self._frame = 0
        self._samples = np.zeros(program.diagram.channels)
        self._squares = np.zeros((program.diagram.channels, len(program.nodes)))

    def add(self, x: FloatArray, trace: FloatArray) -> None:
        """The next block: the input (frames, channels) and the trace (frames, channels, nodes)."""
        settled = trace[max(0, self._wait - self._frame) :]
        for channel in range(settled.shape[1]):
            column = min(channel, len(self._samples) - 1)
            with np.errstate(over="ignore", invalid="ignore"):  # an unstable one may run away to infinity
                self._squares[column] += np.einsum("fn,fn->n", settled[:, channel], settled[:, channel])
            self._samples[column] += len(settled)
        self._frame += len(x)

    def verdict(self, rate: float, output: int = 0, channel: int = 0) -> Whiteness:
        return Whiteness(None, "what floating point rounds grows and shrinks with the signal: there is no such model")

    def prediction(self, rate: float, output: int = 0, channel: int = 0) -> Prediction:
        """An estimate."""
        return predicted_noise(self._program, rate, self._rms(channel), output=output, channel=channel)

    def density(self, output: int = 0, channel: int = 0) -> Density:
        """An estimate."""
        return predicted_density(self._program, self._rms(channel), output=output, channel=channel)

    def _rms(self, channel: int) -> FloatArray:
        return np.asarray(np.sqrt(self._squares[channel] / max(1.0, self._samples[channel])))


def watch(program: Program, wait: int, block: int) -> FixedWatch | FloatWatch:
    """What is to be seen of a program in a run in blocks of `block` frames, after the first `wait`."""
    if isinstance(program.format, Fixed):
        return FixedWatch(program, wait, block)
    return FloatWatch(program, wait)


def _watched(program: Program, sources: tuple[Source, ...]) -> tuple[list[int], tuple[Expected, ...], list[int]]:
    """The columns of a trace that belong to sources of noise, what the model says of each, and which sources they are."""
    columns = {index: column for column, index in enumerate(traced_roundings(program))}
    seen = [(k, source.places[0][0], source) for k, source in enumerate(sources) if source.places[0][0] in columns]
    expected = tuple(_expected(program, node, source) for _, node, source in seen)
    return [columns[node] for _, node, _ in seen], expected, [k for k, _, _ in seen]


def _expected(program: Program, node: int, source: Source) -> Expected:
    """A residue is before minus after, a source's error after minus before."""
    arithmetic = program.arithmetic[node]
    assert isinstance(arithmetic, RoundArithmetic), "a traced rounding is one"
    quantizer = arithmetic.quantizer
    step = 2.0**-quantizer.word.fraction
    lowest = 0.0 if quantizer.rounding == "floor" else -0.5
    return Expected(rounding_name(program, node), -source.mean / step, source.variance / step**2, lowest, quantizer.dither)


def _toward_zero(program: Program, sources: tuple[Source, ...]) -> str:
    """The name of a rounding toward zero, if there is one: half of such an error is the sign of what is rounded."""
    for source in sources:
        node = source.places[0][0]
        arithmetic = program.arithmetic[node]
        if isinstance(arithmetic, RoundArithmetic) and arithmetic.quantizer.rounding == "toward-zero":
            return rounding_name(program, node)
    return ""
