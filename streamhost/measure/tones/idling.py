"""Constants and tones of about a step: whether a realization makes tones of its own of them."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Fixed
from streamhost.measure.levels import power_dbfs
from streamhost.measure.tones.lines import Spectra, line_at
from streamhost.measure.tones.periodogram import alarm, audio_shares, expected_largest, over_median_db
from streamhost.measure.tones.result import Idle
from streamhost.measure.tones.setting import rest_of
from streamhost.measure.tones.steady import SteadyRun
from streamhost.program.ideal import quantized_input
from streamhost.signals import triangular, turning

FloatArray = NDArray[np.float64]

SEED = 1
CONSTANTS_LSB = (0.1, 0.25, 0.37, 0.5, 1.0, 3.0, 10.0)
TONES_LSB = (0.3, 0.6, 1.0, 2.0)
DITHERED_CONSTANTS_LSB = (0.1, 0.25, 0.5)


@dataclass(frozen=True)
class Still:
    """A constant or a tone, in steps of the output's word, with or without dither."""

    constant_lsb: float | None
    tone_lsb: float | None
    dithered: bool


def stills() -> Iterator[Still]:
    """All that are tried."""
    yield from (Still(each, None, False) for each in CONSTANTS_LSB)
    yield from (Still(each, None, True) for each in DITHERED_CONSTANTS_LSB)
    for dithered in (False, True):
        yield from (Still(None, each, dithered) for each in TONES_LSB)


class IdleSearch:
    """Tries stills at an output. Those that the input's word makes the same are tried once, and not those it makes 0."""

    def __init__(self, run: SteadyRun, output: int, bin: int) -> None:
        format = run.realization.format
        assert isinstance(format, Fixed), "only fixed point has steps"
        self._run, self._output, self._bin = run, output, bin
        self._step = 2.0**-format.output.word.fraction
        self._input_step = 2.0**-format.input.word.fraction
        self._tried: set[bytes] = set()

    def idle(self, still: Still) -> Idle | None:
        """What comes of one; None where it is nothing, or was tried before."""
        run = self._run
        x = self._signal(still)
        codes = quantized_input(run.realization.program, x)
        key = codes.tobytes()
        if not codes.any() or key in self._tried:
            return None
        self._tried.add(key)
        steady = run.window_of(x)
        bin = None if still.tone_lsb is None else self._bin
        each = [run.spectra(steady, self._output, channel, bin) for channel in range(run.channels)]
        name = run.realization.outputs[self._output] if len(run.realization.outputs) > 1 else ""
        found = [idle_of(spectra, name, still, round(float(np.abs(codes).max()) / self._input_step)) for spectra in each]
        return max(found, key=lambda idle: (idle.found, idle.over_floor_db or 0.0))

    def _signal(self, still: Still) -> FloatArray:
        frames = self._run.frames
        x = np.full(frames, (still.constant_lsb or 0.0) * self._step)
        if still.tone_lsb is not None:
            x += still.tone_lsb * self._step * turning(frames, self._bin, self._run.window)
        return x + self._input_step * triangular(frames, SEED) if still.dithered else x


def idle_of(spectra: Spectra, name: str, still: Still, input_steps: int) -> Idle:
    """The strongest bin over the noise, and whether it is a tone of the realization's own."""
    shares = audio_shares(spectra.output) > 0.0
    tests = int(np.count_nonzero(shares))
    limit, expected = alarm(tests), expected_largest(tests)
    power = np.where(shares, spectra.output.without(spectra.bin).power, 0.0)
    strongest = int(np.argmax(power / spectra.floor)) if power.any() else None
    line = line_at(spectra, strongest) if strongest is not None else None
    stands_out = strongest is not None and bool(power[strongest] > limit * spectra.floor[strongest])
    return Idle(
        output=name,
        constant_lsb=still.constant_lsb,
        tone_lsb=still.tone_lsb,
        hz=spectra.bin * spectra.output.spacing if spectra.bin is not None else None,
        dithered=still.dithered,
        input_steps=input_steps,
        residual_dbfs=power_dbfs(rest_of(spectra.output, spectra.bin).residual),
        over_floor_db=line.over_floor_db if line is not None else None,
        expected_over_floor_db=over_median_db(expected),
        alarm_over_floor_db=over_median_db(limit),
        found=stands_out and line is not None and line.source == "realization",
        line=line if stands_out else None,
    )
