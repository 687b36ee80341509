"""What the instrument `noise` gives."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

CURVE: Any = {"curve": True}


@dataclass(frozen=True)
class SourceNoise:
    """What one rounding is predicted to add at the output, 20 Hz to the lower of 20 kHz and half the rate.

    share_percent: of the predicted power. Infinite where the error does not die out.
    """

    rounding: str
    predicted_dbfs: float
    share_percent: float


@dataclass(frozen=True)
class SignalNoise:
    """Measured at an output on a signal; a figure that cannot be given is None, with the `reason`.

    measured: rms, +3.01 dB, of realized minus ideal without its mean, 20 Hz to the lower of 20 kHz and half the rate; full:
    0 to half the rate; a, 468_rms: in that band through the curve A of IEC 61672-1 and the curve of ITU-R BS.468-4, 0 dB at
    1 kHz; 468_quasi_peak: the highest reading of the meter of BS.468-4 behind the latter, which reads a steady 1 kHz sine
    as its rms; None too where an overflow was near. measured_interval_db: how far the 95 % interval reaches. mean_lsb: in
    steps of the output's word, None in floating point. excluded_percent: of the frames, for an overflow was near.
    """

    signal: str
    output: str
    measured_dbfs: float | None
    measured_interval_db: float | None
    measured_full_dbfs: float | None
    measured_a_dbfs: float | None
    measured_468_rms_dbfs: float | None
    measured_468_quasi_peak_dbfs: float | None
    mean_lsb: float | None
    white_model_holds: bool | None
    white_model_reason: str
    excluded_percent: float
    reason: str


@dataclass(frozen=True)
class DynamicRange:
    """After AES17-2015: full scale over what an output holds beside a tone of -60 dBFS.

    The tone has triangular dither of the input's word, and is at the frequency nearest to 997 Hz at which the output is
    within 3 dB of its highest gain. dynamic_range_db: through the 468 curve as rms, 0 dB at 2 kHz, as the standard has it
    (from memory); a: through the curve A; unweighted: 20 Hz to 20 kHz.
    """

    output: str
    tone_hz: float
    dynamic_range_db: float | None
    dynamic_range_a_db: float | None
    dynamic_range_unweighted_db: float | None
    reason: str


@dataclass(frozen=True)
class OutputNoise(SignalNoise):
    """At an output on the first signal, beside what is predicted, infinite where an error does not die out.

    sources: predicted of each rounding, the most first; none in floating point, where the prediction is an estimate. channel:
    where channels have coefficients of their own, the worst one, from 1, which all this is of. spectrum_hz, and in it the
    measured and the predicted density, each in dBFS in 1 Hz: curves, without points where there is no figure.
    """

    predicted_dbfs: float | None
    predicted_full_dbfs: float | None
    predicted_a_dbfs: float | None
    predicted_468_rms_dbfs: float | None
    channel: int | None
    sources: tuple[SourceNoise, ...]
    spectrum_hz: NDArray[np.float64] = field(metadata=CURVE, compare=False, repr=False)
    measured_spectrum_dbfs: NDArray[np.float64] = field(metadata=CURVE, compare=False, repr=False)
    predicted_spectrum_dbfs: NDArray[np.float64] = field(metadata=CURVE, compare=False, repr=False)


@dataclass(frozen=True)
class RoundingNoise(OutputNoise):
    """The figures of the output with the most noise, or without a figure; `outputs` has those of each of several.

    ideal: the arithmetic of the ideal run. estimate: the prediction is one, as in floating point. runs: each output on each
    signal, the first ones too. complete: False where the run was broken off, and some runs or dynamic ranges are missing.
    """

    ideal: str
    estimate: bool
    outputs: tuple[OutputNoise, ...]
    runs: tuple[SignalNoise, ...]
    dynamic_ranges: tuple[DynamicRange, ...]
    complete: bool = True

    @property
    def each(self) -> tuple[OutputNoise, ...]:
        """The figures of each output, of the only one too."""
        return self.outputs or (self,)
