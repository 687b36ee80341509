"""Signals and realizations in, frozen results out. Nothing here plots or writes a file."""

from streamhost.measure.limits import Verdict, limit_band, limit_signal, verdicts
from streamhost.measure.measuring import Figures, Measured, Measurement, measure
from streamhost.measure.noise import Noise, noise_of
from streamhost.measure.predicted import Prediction, predicted_noise
from streamhost.measure.response import Deviation, response_deviation
from streamhost.measure.whiteness import Whiteness

__all__ = [
    "Deviation", "Figures", "Measured", "Measurement", "Noise", "Prediction", "Verdict", "Whiteness", "limit_band",
    "limit_signal", "measure", "noise_of", "predicted_noise", "response_deviation", "verdicts",
]
