"""What the instrument `tone` gives."""

from dataclasses import dataclass, field
from math import inf
from typing import Any

import numpy as np
from numpy.typing import NDArray

CURVE: Any = {"curve": True}


@dataclass(frozen=True)
class Line:
    """A line that stands out of the noise around it.

    over_fundamental_db: None where there is no fundamental. over_floor_db: its bin over the median of the noise there.
    relation: "harmonic", "alias" (of the harmonic `order`, which lies above half the rate) or "neither", up to the 50th.
    of_input_dbfs: what the ideal puts out there, run on the same quantized input; added_dbfs: realized minus ideal.
    source: "input", or "realization" where the difference holds more than a quarter of its power.
    """

    hz: float
    dbfs: float
    over_fundamental_db: float | None
    over_floor_db: float
    relation: str
    order: int | None
    of_input_dbfs: float
    added_dbfs: float
    source: str


@dataclass(frozen=True)
class Setting:
    """One tone at one level, at an output; a figure that cannot be given is None, with the `reason`.

    thd_n: everything from 20 Hz to the lower of 20 kHz and half the rate but the fundamental's three bins, over all that
    is there; thd_n_a: the same with the former A-weighted; residual: the former alone. thd: the harmonics 2 to 50 in that
    band that stand out of the noise, over the fundamental, None where none does; thd_at_most: all of them with the noise in
    their bins. of_input: of the ideal, run on the same quantized input. added: of realized minus ideal, fundamental left
    out. overflow_frames: in which something overflowed, in the window. lines: the strongest, at most eight.
    channel: where channels have coefficients of their own, the one that adds most, from 1.
    """

    output: str
    level_dbfs: float
    hz: float
    fundamental_dbfs: float | None = None
    thd_n_db: float | None = None
    thd_n_a_db: float | None = None
    residual_dbfs: float | None = None
    residual_a_dbfs: float | None = None
    thd_db: float | None = None
    thd_at_most_db: float | None = None
    of_input_thd_n_db: float | None = None
    of_input_thd_db: float | None = None
    of_input_residual_dbfs: float | None = None
    added_dbfs: float | None = None
    overflow_frames: int = 0
    lines: tuple[Line, ...] = ()
    channel: int | None = None
    reason: str = ""


@dataclass(frozen=True)
class Idle:
    """A constant or a tone of about a step, in steps of the output's word as it was asked for; None: without.

    dithered: the input before its quantization, by two of its steps from peak to peak. input_steps: the largest code that
    came in. over_floor: of the strongest bin, the fundamental left out, over the median of the noise around it; expected:
    what noise alone shows there, as often more as less; alarm: what it exceeds by chance in one window of a thousand.
    found: it exceeds that, and the line is the realization's own.
    """

    output: str
    constant_lsb: float | None
    tone_lsb: float | None
    hz: float | None
    dithered: bool
    input_steps: int
    residual_dbfs: float
    over_floor_db: float | None
    expected_over_floor_db: float
    alarm_over_floor_db: float
    found: bool
    line: Line | None


@dataclass(frozen=True, eq=False)
class WorstSpectrum:
    """Of the setting at which most is added: power by bin in full scale squared, (bins,), and one window,
    (frames, 1)."""

    hertz: NDArray[np.float64]
    output: NDArray[np.float64]
    of_input: NDArray[np.float64]
    floor: NDArray[np.float64]
    samples: NDArray[np.float64]
    difference: NDArray[np.float64]


@dataclass(frozen=True)
class Tones:
    """thd_n_db: the most of all frequencies at thd_n_level_dbfs, and where that is; None with the `reason`.

    added_dbfs: the most that is added, at the setting `worst`, of those where nothing overflows, or of all. window_frames:
    of a Hann window, in which a tone has a whole number of periods; wait_frames: from zero state before it. false_alarm:
    the chance that noise alone shows a line, in a window. idle: none where it is `floating`, which idle_reason says. seed:
    of the dither.
    """

    thd_n_db: float | None
    thd_n_level_dbfs: float
    thd_n_hz: float | None
    added_dbfs: float | None
    worst: Setting | None
    window_frames: int
    spacing_hz: float
    wait_frames: int | None
    false_alarm: float
    seed: int
    settings: tuple[Setting, ...]
    idle: tuple[Idle, ...]
    idle_reason: str
    ideal: str
    floating: bool
    complete: bool
    reason: str
    worst_spectrum: WorstSpectrum | None = field(default=None, metadata=CURVE, compare=False, repr=False)

    @property
    def judged(self) -> tuple[Setting, ...]:
        """Of each output the setting with the most THD+N, or without a figure, at thd_n_level_dbfs."""
        at_level = [each for each in self.settings if each.level_dbfs == self.thd_n_level_dbfs]
        outputs = dict.fromkeys(each.output for each in at_level)
        return tuple(max((each for each in at_level if each.output == output),
                         key=lambda each: inf if each.thd_n_db is None else each.thd_n_db) for output in outputs)
