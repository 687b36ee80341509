"""What the standards allow: for each standard frequency the wanted gain and how far a filter may be from it."""

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from math import inf
from typing import Any

import numpy as np

from streamhost.filters.curves.analogue import CURVES
from streamhost.filters.curves.band_mask import band_goals
from streamhost.filters.curves.bands import THIRD_OCTAVES, exact_hz
from streamhost.filters.curves.goal import Goal
from streamhost.filters.curves.k_weighting import TABULATED_RATE, k_weighting
from streamhost.filters.curves.names import fm_name, phono_name

OWN_BUDGET_DB = 0.1


@dataclass(frozen=True)
class Standard:
    """Goals of one curve. `limits` says whose limits they are; an own budget is called one.

    The goals are about the gain as it is, or about that relative to the gain at a frequency.
    """

    limits: str
    goals: tuple[Goal, ...]
    relative_to_hz: float | None = None


def standard(kind: str, values: Mapping[str, Any]) -> Standard:
    """Goals of a kind of KINDS with these parameters, at all frequencies that the standard names."""
    return _STANDARDS[kind](values)


# IEC 61672-1:2013, Table 3, as quoted: upper and lower limit of class 1 from 10 Hz to 20 kHz in third octaves.
CLASS_1 = (
    *((3.0, -inf), (2.5, -inf), (2.0, -4.0), (2.0, -2.0), (2.0, -1.5), (1.5, -1.5)),
    *((1.0, -1.0),) * 14,
    (0.7, -0.7),
    *((1.0, -1.0),) * 6,
    *((1.5, -1.5), (1.5, -2.0), (1.5, -2.5), (2.0, -3.0), (2.0, -5.0), (2.5, -16.0), (3.0, -inf)),
)

# Rec. ITU-R BS.468-4, Table 1, as quoted: Hz, dB, tolerance. At 6.3 kHz it prints a tolerance of 0, which nothing
# can meet; AES17-2015 prints 0.01 dB there, which is taken. At 31.5 kHz there is no lower limit.
TABLE_468 = (
    *((31.5, -29.9, 2.0), (63, -23.9, 1.4), (100, -19.8, 1.0), (200, -13.8, 0.85), (400, -7.8, 0.7), (800, -1.9, 0.55)),
    *((1000, 0.0, 0.5), (2000, 5.6, 0.5), (3150, 9.0, 0.5), (4000, 10.5, 0.5), (5000, 11.7, 0.5), (6300, 12.2, 0.01)),
    *((7100, 12.0, 0.2), (8000, 11.4, 0.4), (9000, 10.1, 0.6), (10000, 8.1, 0.8), (12500, 0.0, 1.2), (14000, -5.3, 1.4)),
    *((16000, -11.7, 1.6), (20000, -22.2, 2.0), (31500, -42.7, 2.8)),
)

PHONO_HZ = (
    *(20, 30, 40, 50, 60, 80, 100, 150, 200, 300, 400, 500, 800, 1000, 1500, 2000, 3000, 4000, 5000, 6000, 8000),
    *(10000, 12000, 15000, 20000),
)
FM_HZ = (30, 100, 500, 1000, 3000, 5000, 10000, 15000)
K_HZ = (20, 31.5, 63, 100, 200, 400, 500, 997, 1000, 2000, 4000, 8000, 10000, 16000, 20000)


def _weighting(name: str) -> Standard:
    """The limits are about the design goal at the exact frequencies, not about the table's rounded decibels."""
    hertz = [exact_hz(nominal) for nominal in THIRD_OCTAVES]
    decibels = CURVES[name].decibels(hertz)
    rows = zip(hertz, decibels.tolist(), CLASS_1, strict=True)
    goals = tuple(Goal(f, gain, gain, lower, upper) for f, gain, (upper, lower) in rows)
    return Standard("class 1 of IEC 61672-1:2013, Table 3, about the response at exact frequencies", goals)


def _noise_weighting() -> Standard:
    analogue = CURVES["itu-r-468"].decibels([f for f, _, _ in TABLE_468]).tolist()
    goals = tuple(
        Goal(float(f), gain, wanted, -tolerance if f < 31500 else -inf, tolerance)
        for (f, wanted, tolerance), gain in zip(TABLE_468, analogue, strict=True)
    )
    return Standard("Rec. ITU-R BS.468-4, Table 1; at 6.3 kHz, where it allows 0 dB, 0.01 dB as in AES17-2015", goals)


def _budgeted(name: str, hertz: Iterable[float]) -> Standard:
    points = [float(f) for f in hertz]
    return _own_budget("the standard's tolerance is not known here", points, CURVES[name].decibels(points).tolist())


def _loudness() -> Standard:
    gains = 20 * np.log10(np.abs(k_weighting(TABULATED_RATE).response(K_HZ)))
    return _own_budget("Rec. ITU-R BS.1770 asks for the response at 48 kHz, without a tolerance", K_HZ, gains.tolist())


def _own_budget(why: str, hertz: Iterable[float], gains: Iterable[float]) -> Standard:
    goals = [Goal(f, gain, gain, -OWN_BUDGET_DB, OWN_BUDGET_DB) for f, gain in zip(hertz, gains, strict=True)]
    return Standard(f"own budget of {OWN_BUDGET_DB:g} dB ({why})", tuple(goals))


def _band(values: Mapping[str, Any], bands_per_octave: int) -> Standard:
    goals = band_goals(values["frequency"], bands_per_octave, values["order"])
    return Standard("class 1 of IEC 61260-1:2014, Table 1", goals, exact_hz(values["frequency"]))


_STANDARDS: Mapping[str, Callable[[Mapping[str, Any]], Standard]] = {
    "a-weighting": lambda values: _weighting("a-weighting"),
    "c-weighting": lambda values: _weighting("c-weighting"),
    "itu-r-468": lambda values: _noise_weighting(),
    "k-weighting": lambda values: _loudness(),
    "phono-replay": lambda values: _budgeted(phono_name(values["subsonic_us"]), PHONO_HZ),
    "fm-de-emphasis": lambda values: _budgeted(fm_name(values["time_constant_us"]), FM_HZ),
    "octave-band": lambda values: _band(values, 1),
    "third-octave-band": lambda values: _band(values, 3),
}
