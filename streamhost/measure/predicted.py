"""The noise that theory predicts at the output, counted as the measured noise is counted."""

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from math import inf, isfinite

import numpy as np

from streamhost.diagram.fan import to_output
from streamhost.formats import Float
from streamhost.measure.bands import audio_band
from streamhost.measure.frequencies import FloatArray, breakpoints, integral, integrals
from streamhost.measure.levels import power_dbfs
from streamhost.measure.weighting import a_weighting, itu_468_weighting
from streamhost.program.float_errors import float_spectrum
from streamhost.program.program import Program
from streamhost.program.sources import noise_sources, noise_spectrum, source_spectra

Density = Callable[[FloatArray], FloatArray]


@dataclass(frozen=True)
class Prediction:
    """Noise in dBFS: in the audio band, from 0 to half the rate, and in the audio band through the curves A and 468.

    Infinite where an error does not die out; None in the band of a rate that has none.
    """

    dbfs: float | None
    full_dbfs: float
    a_dbfs: float | None
    rms_468_dbfs: float | None


def predicted_noise(
    program: Program, rate: float, rms: FloatArray | None = None, *, output: int = 0, channel: int = 0
) -> Prediction:
    """The noise of a program's roundings at an output under the white model, with the coefficients of a channel.

    A floating-point program's is an estimate that needs the `rms` of every node, (nodes,).
    """
    density = predicted_density(program, rms, output=output, channel=channel)
    poles = {complex(pole) for pole in to_output(program.diagram, [], channel, output=output).poles}
    full = _dbfs(integral(density, breakpoints(poles, 0.0, np.pi)))
    band = audio_band(rate)
    if band is None:
        return Prediction(None, full, None, None)
    low, high = (2.0 * np.pi * edge / rate for edge in band)

    def heard(w: FloatArray) -> FloatArray:
        hertz = w * rate / (2.0 * np.pi)
        weights = np.column_stack((np.ones_like(w), a_weighting(hertz), itu_468_weighting(hertz)))
        return np.asarray(density(w)[:, None] * weights)

    plain, a, by_468 = (_dbfs(power) for power in integrals(heard, breakpoints(poles, low, high)))
    return Prediction(plain, full, a, by_468)


def predicted_band_noise(program: Program, rate: float, *, output: int = 0, channel: int = 0) -> float:
    """Of a fixed-point program the `dbfs` alone, or where the rate has no audio band `full_dbfs`."""
    low, high = (2.0 * np.pi * edge / rate for edge in audio_band(rate) or (0.0, rate / 2.0))
    return _between(program, low, high, output, channel)


def predicted_full_noise(program: Program, *, output: int = 0, channel: int = 0) -> float:
    """Of a fixed-point program the `full_dbfs` alone."""
    return _between(program, 0.0, np.pi, output, channel)


def _between(program: Program, low: float, high: float, output: int, channel: int) -> float:
    poles = {complex(pole) for pole in to_output(program.diagram, [], channel, output=output).poles}
    return _dbfs(integral(predicted_density(program, output=output, channel=channel), breakpoints(poles, low, high)))


def predicted_density(program: Program, rms: FloatArray | None = None, *, output: int = 0, channel: int = 0) -> Density:
    """The power density at radians a frame: its mean over 0 .. pi is the noise power. `rms` as in `predicted_noise`."""
    if isinstance(program.format, Float):
        assert rms is not None, "what floats round depends on the signal"
        return lambda w: float_spectrum(program, rms, w, channel, output)
    return lambda w: noise_spectrum(program, w, channel, output)


def _dbfs(integrated: float) -> float:
    power = float(integrated) / np.pi
    return power_dbfs(power) if isfinite(power) else inf


def source_shares(program: Program, rate: float, edges: FloatArray, channel: int = 0, output: int = 0) -> FloatArray:
    """What each source puts into each band of the predicted noise at an output, as a share of all of it, (bands, sources).

    edges: of the bands, in radians a frame; only what lies in the audio band counts, where the rate has one. Sources
    that do not die out count alike, and then nothing else does. All shares are 0 where no source reaches the output.
    """
    band = audio_band(rate) or (0.0, rate / 2.0)
    low, high = (2.0 * np.pi * edge / rate for edge in band)
    poles = {complex(pole) for pole in to_output(program.diagram, [], channel, output=output).poles}
    inside = np.clip(edges, low, high)
    power = np.array([integrals(lambda w: source_spectra(program, w, channel, output), breakpoints(poles, *pair))
                      if pair[1] > pair[0] else np.zeros(len(noise_sources(program, channel))) for pair in pairwise(inside)])
    if not np.isfinite(power).all():
        power = np.where(np.isfinite(power), 0.0, 1.0)
    return np.asarray(power / (power.sum() or 1.0), dtype=np.float64)
