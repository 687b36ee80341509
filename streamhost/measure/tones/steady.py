"""A realization and its ideal on a signal that goes on: what both put out in one window, after they have settled."""

from collections.abc import Iterator
from dataclasses import dataclass
from math import isfinite

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.norms import power_response, settling_frames
from streamhost.formats import Float
from streamhost.measure.levels import has_run_away
from streamhost.measure.running import Run
from streamhost.measure.tones.lines import Spectra
from streamhost.measure.tones.periodogram import noise_floor, periodogram
from streamhost.program.float_errors import float_errors
from streamhost.program.sources import noise_spectrum
from streamhost.realization import Realization

FloatArray = NDArray[np.float64]

BLOCK = 1 << 14
SETTLINGS = 2.0
"""The settling time leaves 120 dB, which a tone's start would be heard by; twice that leaves 240."""

LONGEST_WAIT_S = 20.0

SHAPE_LEAST = 1e-12
"""Where the noise is expected to be nothing, at a zero of a response: something else lies there."""


@dataclass(frozen=True, eq=False)
class Steady:
    """One window: output and difference, realized minus ideal, (frames, outputs, channels).

    overflows: frames in which something overflowed, (channels,). rms: of every node in floating point, (channels, nodes),
    else none. ran_away: no longer finite.
    """

    output: FloatArray
    difference: FloatArray
    overflows: NDArray[np.int64]
    rms: FloatArray | None
    ran_away: bool


class SteadyRun:
    """Runs signals of `wait` + `window` frames from zero state. `wait` is None where the filter does not settle."""

    def __init__(self, realization: Realization, window: int) -> None:
        self.realization, self.window = realization, window
        diagram = realization.program.diagram
        self.channels = diagram.channels
        settling = max(settling_frames(diagram, channel) for channel in range(diagram.channels))
        self.wait = self._waited(settling, realization.rate)
        self._run = Run(realization, self.channels)
        self.ideal = self._run.ideal.label
        self._powers: dict[tuple[int, int], FloatArray] = {}

    @staticmethod
    def _waited(settling: float, rate: float) -> int | None:
        if not isfinite(settling) or settling > LONGEST_WAIT_S * rate:
            return None
        return int(min(SETTLINGS * settling, LONGEST_WAIT_S * rate))

    @property
    def frames(self) -> int:
        """Of a signal."""
        assert self.wait is not None, "only what settles is run"
        return self.wait + self.window

    def window_of(self, x: FloatArray) -> Steady:
        """What comes of a signal, (frames,), the same for all channels."""
        assert self.wait is not None and len(x) == self.frames, "a signal has its frames"
        self._run.restart()
        outputs = len(self.realization.outputs)
        output, difference = (np.empty((self.window, outputs, self.channels)) for _ in range(2))
        overflows = np.zeros(self.channels, np.int64)
        floating = isinstance(self.realization.format, Float)
        squares = np.zeros((self.channels, len(self.realization.program.nodes))) if floating else None
        for start, end in self._blocks():
            block = self._run.step(np.repeat(x[start:end, None], self.channels, axis=1))
            if start < self.wait:
                continue
            at = slice(start - self.wait, end - self.wait)
            output[at], difference[at] = block.output, block.difference
            overflows += block.marks.astype(np.bool_).sum(axis=0)
            if squares is not None:
                with np.errstate(over="ignore", invalid="ignore"):
                    squares += np.einsum("fcn,fcn->cn", block.trace, block.trace)
        rms = None if squares is None else np.sqrt(squares / self.window)
        return Steady(output, difference, overflows, rms, has_run_away(output) or has_run_away(difference))

    def _blocks(self) -> Iterator[tuple[int, int]]:
        """A new block begins with the window."""
        assert self.wait is not None, "only what settles is run"
        for first, last in ((0, self.wait), (self.wait, self.frames)):
            for start in range(first, last, BLOCK):
                yield start, min(start + BLOCK, last)

    def spectra(self, steady: Steady, output: int, channel: int, bin: int | None) -> Spectra:
        """Of one output of one channel."""
        rate = self.realization.rate
        samples, difference = steady.output[:, output, channel], steady.difference[:, output, channel]
        found, of_input, added = (periodogram(each, rate) for each in (samples, samples - difference, difference))
        shape = self._shape(output, channel, None if steady.rms is None else steady.rms[channel])
        return Spectra(found, of_input, added, noise_floor(found, shape), bin)

    def _shape(self, output: int, channel: int, rms: FloatArray | None) -> FloatArray | None:
        """How the noise is spread where theory has it: the input's rounding and the roundings' own; None where it has not."""
        program = self.realization.program
        if (output, channel) not in self._powers:
            self._powers[output, channel] = self._power(output, channel)
        density = self._powers[output, channel]
        if rms is not None:
            density = density @ np.array(list(float_errors(program, rms).values()))
        if not np.isfinite(density).all() or not density.any():
            return None
        return np.asarray(np.maximum(density / density.max(), SHAPE_LEAST), dtype=np.float64)

    def _power(self, output: int, channel: int) -> FloatArray:
        """Power density by bin; in floating point of each error of power 1, (bins, errors)."""
        program = self.realization.program
        w = 2.0 * np.pi * np.arange(self.window // 2 + 1) / self.window
        if isinstance(program.format, Float):
            errors = list(float_errors(program, np.ones(len(program.nodes))))
            return power_response(program.diagram, errors, w, channel, output=output)
        response = power_response(program.diagram, [program.diagram.inputs[0]], w, channel, output=output)[:, 0]
        step = 2.0**-program.format.input.word.fraction
        return np.asarray(noise_spectrum(program, w, channel, output) + step**2 / 12.0 * response, dtype=np.float64)
