"""The mask of IEC 61260-1:2014 for octave bands and parts of them, class 1 (Table 1, as quoted)."""

from collections.abc import Iterator, Sequence
from itertools import pairwise
from math import inf, log10

import numpy as np
import numpy.typing as npt

from streamhost.filters.curves.bands import OCTAVE_RATIO, band_edges, exact_hz
from streamhost.filters.curves.goal import Goal

# x and attenuation in dB at octave_ratio^x of the mid-band: at most, inside; at least, outside.
INSIDE = ((0.0, 0.4), (1 / 8, 0.5), (1 / 4, 0.7), (3 / 8, 1.4), (1 / 2, 5.3))
OUTSIDE = ((1 / 2, 1.2), (1.0, 16.6), (2.0, 40.5), (3.0, 60.0), (4.0, 70.0), (5.0, 70.0), (6.0, 70.0))
LEAST_INSIDE = -0.4
EDGE = 1e-9
"""Of a frequency, within which it is taken to be the band's edge."""
STEPS = 8
"""Points from one breakpoint to the next: between them the limits run straight over the logarithm of frequency."""


def band_goals(nominal_hz: float, bands_per_octave: int, order: int) -> tuple[Goal, ...]:
    """Goals relative to the gain at the exact mid-band, on both sides, rising; the analogue filter is Butterworth's."""
    goals = [
        Goal(f, _butterworth(f, nominal_hz, bands_per_octave, order), 0.0, lower, upper)
        for ratio, lower, upper in _mask(bands_per_octave)
        for f in {exact_hz(nominal_hz) * ratio, exact_hz(nominal_hz) / ratio}
    ]
    return tuple(sorted(goals, key=lambda goal: (goal.hertz, goal.upper_db)))


def band_limits(
    hertz: npt.NDArray[np.float64], nominal_hz: float, bands_per_octave: int
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """The lowest and highest gain in dB, relative to that at the exact mid-band, at frequencies (n,) above 0 Hz.

    Between breakpoints limits run straight over the logarithm of frequency; at the band's edge both sides' limits hold.
    """
    ratio = hertz / exact_hz(nominal_hz)
    distance = np.maximum(ratio, 1 / ratio)
    edge = breakpoint_ratio(1 / 2, bands_per_octave) * (1 + EDGE)

    def limit(corners: Sequence[tuple[float, float]]) -> npt.NDArray[np.float64]:
        x, limits = zip(*corners, strict=True)
        ratios = [breakpoint_ratio(each, bands_per_octave) for each in x]
        return np.asarray(np.interp(np.log(distance), np.log(ratios), limits), dtype=np.float64)

    lower = np.where(distance <= edge, -limit(INSIDE), -inf)
    upper = np.where(distance * (1 + EDGE) ** 2 >= edge, -limit(OUTSIDE), -LEAST_INSIDE)
    return lower, upper


def breakpoint_ratio(x: float, bands_per_octave: int) -> float:
    """f / mid-band at octave_ratio^x, drawn together for a part of an octave (IEC 61260-1, formula from memory)."""
    part = (OCTAVE_RATIO ** (0.5 / bands_per_octave) - 1) / (OCTAVE_RATIO**0.5 - 1)
    return float(1 + part * (OCTAVE_RATIO**x - 1))


def _mask(bands_per_octave: int) -> Iterator[tuple[float, float, float]]:
    """(ratio, lowest gain, highest gain) at and above the mid-band; the edge itself stands on both sides."""
    for ratio, most in _interpolated(INSIDE, bands_per_octave):
        yield ratio, -most, -LEAST_INSIDE
    for ratio, least in _interpolated(OUTSIDE, bands_per_octave):
        yield ratio, -inf, -least


def _interpolated(corners: Sequence[tuple[float, float]], bands_per_octave: int) -> Iterator[tuple[float, float]]:
    points = [(log10(breakpoint_ratio(x, bands_per_octave)), limit) for x, limit in corners]
    for (start, first), (end, last) in pairwise(points):
        for step in range(STEPS):
            part = step / STEPS
            yield 10 ** (start + part * (end - start)), first + part * (last - first)
    yield 10 ** points[-1][0], points[-1][1]


def _butterworth(hertz: float, nominal_hz: float, bands_per_octave: int, order: int) -> float:
    low, high = band_edges(nominal_hz, bands_per_octave)
    detuning = (hertz - low * high / hertz) / (high - low)
    return float(-10 * log10(1 + detuning ** (2 * order)))
