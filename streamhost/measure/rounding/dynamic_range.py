"""Dynamic range with a tone of -60 dBFS, and the frequency for a tone."""

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Fixed
from streamhost.measure.bands import audio_band
from streamhost.measure.deviation import Responses
from streamhost.measure.levels import decibels
from streamhost.measure.noise_sum import noise_of
from streamhost.measure.rounding.result import DynamicRange
from streamhost.measure.running import Run
from streamhost.measure.weighting import itu_468_weighting
from streamhost.realization import Realization
from streamhost.signals import random_words, sine

FloatArray = NDArray[np.float64]

PREFERRED_HZ = 997.0
PASS_DB = 3.0
LEVEL_DBFS = -60.0
SEED = 17
BLOCK = 1 << 15
UNITY_HZ = 2000.0
"""Where the standard's rms weighting is 0 dB."""


def tone_hz(realization: Realization, output: int, channel: int = 0) -> float:
    """The frequency nearest to 997 Hz, by ratio, at which an output is within 3 dB of its highest gain."""
    low, high = audio_band(realization.rate) or (realization.rate / 1000.0, realization.rate / 2.0)
    grid = np.append(np.geomspace(low, 0.95 * high, 2000), PREFERRED_HZ)
    grid = grid[grid <= 0.95 * high]
    _, gain = Responses(realization, channel, (output,)).magnitudes(grid)
    passing = grid[gain >= 10.0 ** (-PASS_DB / 20.0) * gain.max()]
    return float(passing[np.argmin(np.abs(np.log(passing / PREFERRED_HZ)))]) if len(passing) else PREFERRED_HZ


def dynamic_range(realization: Realization, place: int, output: str, frames: int, wait: int) -> DynamicRange:
    """Of the output at a place, on `frames` frames, of which the first `wait` do not count."""
    rate, hertz = realization.rate, tone_hz(realization, place)
    if realization.unstable:
        return DynamicRange(output, hertz, None, None, None, "the filter is not stable")
    columns = realization.diagram.channels
    x = sine(wait + frames, rate, hertz, LEVEL_DBFS, columns) + _dither(realization, wait + frames)[:, None]
    run = Run(realization, columns)
    y = np.concatenate([run.step(x[start : start + BLOCK]).output[:, place] for start in range(0, len(x), BLOCK)])
    found = noise_of(beside_tone(y[wait:], rate, hertz), rate)
    if found.dbfs is None or found.a_dbfs is None or found.rms_468_dbfs is None:
        return DynamicRange(output, hertz, None, None, None, found.reason)
    unity = decibels(float(itu_468_weighting(UNITY_HZ)))
    return DynamicRange(output, hertz, unity - found.rms_468_dbfs, -found.a_dbfs, -found.dbfs, "")


def beside_tone(y: FloatArray, rate: float, hertz: float) -> FloatArray:
    """What signals (frames, channels) hold beside a sine of that frequency and a constant, by least squares."""
    turns = 2.0 * np.pi * hertz / rate * np.arange(len(y))
    basis = np.column_stack((np.cos(turns), np.sin(turns), np.ones(len(y))))
    solution = np.linalg.solve(basis.T @ basis, basis.T @ y)
    return np.asarray(y - basis @ solution)


def _dither(realization: Realization, frames: int) -> FloatArray:
    """Triangular, two steps of the input's word wide; none in floating point."""
    if not isinstance(realization.format, Fixed):
        return np.zeros(frames)
    step = 2.0**-realization.format.input.word.fraction
    first, second = (random_words(SEED + k, frames) / 2.0**64 for k in range(2))
    return np.asarray(step * (first - second))
