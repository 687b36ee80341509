"""Whether a realization keeps the limits of its preset, on a signal that is always the same."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.bands import Band, audio_band
from streamhost.measure.measuring import Measured

SEED = 1
SECONDS = 10.0
PEAK_DBFS = -20.0


@dataclass(frozen=True)
class Verdict:
    """One limit: its key, what was found (None: no figure, for that reason), what is allowed at most, and its unit.

    `output`: of which of several.
    """

    key: str
    found: float | None
    allowed: float
    unit: str
    reason: str = ""
    output: str = ""

    @property
    def meets(self) -> bool:
        return self.found is not None and self.found <= self.allowed


def limit_band(limits: Mapping[str, object], rate: float) -> Band:
    """The band of the response: as stated, else 20 Hz to 20 kHz, or all there is where half the rate is below that."""
    stated = limits.get("band_hz")
    if isinstance(stated, tuple):
        return float(stated[0]), float(stated[1])
    return audio_band(rate) or (0.0, rate / 2.0)


def limit_signal(rate: float, channels: int = 1) -> NDArray[np.float64]:
    """White noise, uniform, peak -20 dBFS, 10 s, seed 1: busy, and with headroom as a programme has it.

    One channel is enough, unless channels have coefficients of their own.
    """
    from streamhost.signals import white

    return white(round(SECONDS * rate), channels, SEED, PEAK_DBFS)


def verdicts(limits: Mapping[str, object], measured: Measured) -> tuple[Verdict, ...]:
    """Each stated limit against what was measured on `limit_signal` over `limit_band`, at each output."""
    found = []
    noise, deviation = limits.get("noise_dbfs"), limits.get("response_deviation_db")
    for figures in measured.outputs:
        name = figures.name if len(measured.outputs) > 1 else ""
        if isinstance(noise, float | int):
            found.append(Verdict("noise_dbfs", figures.noise.dbfs, float(noise), "dBFS", figures.noise.reason, name))
        if isinstance(deviation, float | int):
            reason = figures.deviation.reason
            found.append(Verdict("response_deviation_db", figures.deviation.db, float(deviation), "dB", reason, name))
    return tuple(found)
