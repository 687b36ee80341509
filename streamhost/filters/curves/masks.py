"""The masks of standards for whole responses: lowest and highest gain at any frequency."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from math import inf

import numpy as np
import numpy.typing as npt

from streamhost.filters.curves.analogue import CURVES
from streamhost.filters.curves.band_mask import OUTSIDE, band_limits, breakpoint_ratio
from streamhost.filters.curves.bands import OCTAVES, THIRD_OCTAVES, exact_hz
from streamhost.filters.curves.limits import standard

FloatArray = npt.NDArray[np.float64]
SAME = 1e-9
"""Of a frequency, within which two are taken to be one."""


@dataclass(frozen=True)
class Mask:
    """`nominals`: the mid-bands that it can have, of which the one that fits best is taken unless one is named; or none.

    `corners`: frequencies that are looked at in any case. `limits`: lowest and highest gain in dB at frequencies (n,).
    """

    source: str
    nominals: tuple[float, ...]
    corners: Callable[[float], list[float]]
    limits: Callable[[FloatArray, float], tuple[FloatArray, FloatArray]]


def _bands(bands_per_octave: int, nominals: tuple[float, ...]) -> Mask:
    ratios = [breakpoint_ratio(x, bands_per_octave) for x in (0.0, 1 / 8, 1 / 4, 3 / 8, *(x for x, _ in OUTSIDE))]

    def corners(nominal: float) -> list[float]:
        return sorted({exact_hz(nominal) * ratio for each in ratios for ratio in (each, 1 / each)})

    return Mask("IEC 61260-1:2014, Table 1", nominals, corners,
                lambda hertz, nominal: band_limits(hertz, nominal, bands_per_octave))


def _weighting(name: str) -> Mask:
    """Class 1 about the exact curve. Between two frequencies of the table the wider of their limits holds (from memory)."""
    goals = standard(name, {}).goals
    places = np.array([goal.hertz for goal in goals])
    lower, upper = (np.array([getattr(goal, side) for goal in goals]) for side in ("lower_db", "upper_db"))

    def limits(hertz: FloatArray, _: float) -> tuple[FloatArray, FloatArray]:
        at = np.argmin(np.abs(np.log(hertz[:, None] / places)), axis=1)
        exactly = np.abs(hertz / places[at] - 1.0) < SAME
        right = np.clip(np.searchsorted(places, hertz), 1, len(places) - 1)
        low = np.where(exactly, lower[at], np.minimum(lower[right - 1], lower[right]))
        high = np.where(exactly, upper[at], np.maximum(upper[right - 1], upper[right]))
        outside = (hertz < places[0] * (1 - SAME)) | (hertz > places[-1] * (1 + SAME))
        wanted = CURVES[name].decibels(hertz)
        return np.where(outside, -inf, wanted + low), np.where(outside, inf, wanted + high)

    return Mask("IEC 61672-1:2013, Table 3", (), lambda nominal: places.tolist(), limits)


MASKS: Mapping[str, Mask] = {
    "octave-class-1": _bands(1, OCTAVES),
    "third-octave-class-1": _bands(3, THIRD_OCTAVES),
    "a-weighting-class-1": _weighting("a-weighting"),
    "c-weighting-class-1": _weighting("c-weighting"),
}


def mid_bands_text(name: str) -> str:
    """Which mid-bands a mask can have, in words."""
    nominals = ", ".join(f"{each:g}" for each in MASKS[name].nominals)
    return f"the nominal mid-bands of {name} are {nominals} Hz" if nominals else f"{name} has no mid-band"
