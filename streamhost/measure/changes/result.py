"""What the instrument `transients` gives.

A deviation is the output after a change less the output of the new filter had it run all along, both in the arithmetic of
the realization; so what only differs in rounding is in it too. It begins with the change, and so does its click, however
smoothly the output goes over: a warm change has no deviation, and yet a jump; a ramp has one, and no jump. Two figures tell
that apart: `jump`, the output in the frame of the change less what would have come without it, and on a constant, where all
that is not constant is click, `heard_click`, that of the output itself.
"""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
CURVE: Any = {"curve": True}


@dataclass(frozen=True)
class Trace:
    """Around the worst change of a changeover, of one output and channel, (frames,): the change is at frame `at` of it.

    heard: the output; before, target: of the old and the new filter, each had it run all along.
    """

    change: str
    signal: str
    changeover: str
    at: int
    heard: Array = field(metadata=CURVE, compare=False, repr=False)
    before: Array = field(metadata=CURVE, compare=False, repr=False)
    target: Array = field(metadata=CURVE, compare=False, repr=False)

    @classmethod
    def of(cls, told: tuple[str, str, str], frame: int, heard: Array, before: Array, target: Array) -> "Trace":
        """told: change, signal and changeover. heard: from the frame of the change on; the others: the whole."""
        return cls(told[0], told[1], told[2], frame, np.concatenate([before[:frame], heard]), before.copy(), target.copy())

    @property
    def deviation(self) -> Array:
        """From the new filter, 0 before the change."""
        found = self.heard - self.target
        found[: self.at] = 0.0
        return found


@dataclass(frozen=True)
class Transient:
    """One change on one signal by one changeover; of several frames tried, outputs and channels, the largest of each figure.

    kind: "parameter" or "form". changeover: how the state is come by; "ramp" is keep with the parameter moved along in sets
    of coefficients, one every 32 frames. over_ms: how long a fade or ramp takes. frame: of the recording, where the click is
    worst; None in a generated signal.
    peak: of the deviation. energy: of the deviation until it is within the noise, 0 dB being that of a full-scale sine
    that lasts 1 s. settling: until the deviation stays within the noise, None where it did not within the run. click: the
    deviation as ITU-R BS.468-4 reads it, weighted and quasi-peak, a full-scale sine of 1 kHz being 0. heard_click, jump: see
    above. clipped: carried states that did not fit their word. reason: why there are no figures.
    """

    change: str
    kind: str
    signal: str
    changeover: str
    over_ms: float | None
    frame: int | None
    peak_dbfs: float | None
    energy_dbfs_s: float | None
    settling_frames: int | None
    settling_ms: float | None
    click_468_dbfs: float | None
    heard_click_468_dbfs: float | None
    jump_dbfs: float | None
    noise_dbfs: float | None
    clipped: int
    reason: str


@dataclass(frozen=True)
class Transients:
    """The worst parameter change by the `changeover` that is judged, on any signal, and every change that was tried.

    change, signal: of the worst click. A figure is None where one of these changes has none, with the `reason`. level_dbfs: of
    the constant and the tone. within_noise_factor: a deviation is within the noise where it stays below so many times the rms
    of the realization's rounding noise, which is predicted, or in floating point measured on a part of the recording.
    Curves: traces, the worst of each changeover.
    """

    changeover: str
    change: str
    signal: str
    peak_dbfs: float | None
    energy_dbfs_s: float | None
    settling_ms: float | None
    click_468_dbfs: float | None
    reason: str
    level_dbfs: float
    within_noise_factor: float
    noise_is_predicted: bool
    changes: tuple[Transient, ...]
    complete: bool
    traces: tuple[Trace, ...] = field(metadata=CURVE, compare=False, repr=False)
