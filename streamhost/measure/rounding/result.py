"""What the instrument `noise` gives."""

from dataclasses import dataclass


@dataclass(frozen=True)
class OutputNoise:
    """Of one output; a figure that cannot be given is None, with the `reason`.

    measured: rms, +3.01 dB, of realized minus ideal without its mean, 20 Hz to the lower of 20 kHz and half the rate;
    full: 0 to half the rate; a: A-weighted in that band. measured_interval_db: how far the 95 % interval reaches.
    predicted: the same by the white model, infinite where an error does not die out; an estimate in floating point.
    mean_lsb: in steps of the output's word, None in floating point. excluded_percent: of the frames, for an overflow was
    near. channel: where channels have coefficients of their own, the worst one, from 1, which all this is of.
    """

    output: str
    predicted_dbfs: float | None
    predicted_full_dbfs: float | None
    predicted_a_dbfs: float | None
    measured_dbfs: float | None
    measured_interval_db: float | None
    measured_full_dbfs: float | None
    measured_a_dbfs: float | None
    mean_lsb: float | None
    white_model_holds: bool | None
    white_model_reason: str
    excluded_percent: float
    channel: int | None
    reason: str


@dataclass(frozen=True)
class RoundingNoise(OutputNoise):
    """The figures of the output with the most noise, or without a figure; `outputs` has those of each of several.

    ideal: the arithmetic of the ideal run. estimate: the prediction is one, as in floating point.
    """

    ideal: str
    estimate: bool
    outputs: tuple[OutputNoise, ...]

    @property
    def each(self) -> tuple[OutputNoise, ...]:
        """The figures of each output, of the only one too."""
        return self.outputs or (self,)
