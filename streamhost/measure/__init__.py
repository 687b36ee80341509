"""Signals and realizations in, frozen results out. Nothing here plots or writes a file."""

from streamhost.measure.changes import Transient, Transients, transients
from streamhost.measure.cycles import LimitCycles, limit_cycles
from streamhost.measure.deviation import Deviation, response_deviation
from streamhost.measure.floats import FloatParticulars, float_particulars
from streamhost.measure.limits import LIMITS, Limit, Verdict, limit_band, limit_signal, stated_limits, verdicts
from streamhost.measure.measuring import Figures, Measured, Measurement, measure
from streamhost.measure.noise_sum import Noise, noise_of
from streamhost.measure.overflows import Overflow, Recovery, Register, overflow
from streamhost.measure.predicted import Prediction, predicted_noise
from streamhost.measure.realized import BandDeviation, Response, response
from streamhost.measure.rounding import DynamicRange, OutputNoise, RoundingNoise, SignalNoise, SourceNoise, noise
from streamhost.measure.settings import Setting, Table, Turn, table
from streamhost.measure.tones import Tones, tone
from streamhost.measure.whiteness import Whiteness

__all__ = [
    "LIMITS", "BandDeviation", "Deviation", "DynamicRange", "Figures", "FloatParticulars", "Limit", "LimitCycles",
    "Measured", "Measurement", "Noise", "OutputNoise", "Overflow", "Prediction", "Recovery", "Register", "Response",
    "RoundingNoise", "Setting", "SignalNoise", "SourceNoise", "Table", "Tones", "Transient", "Transients", "Turn", "Verdict",
    "Whiteness", "float_particulars", "limit_band", "limit_cycles", "limit_signal", "measure", "noise", "noise_of",
    "overflow", "predicted_noise", "response", "response_deviation", "stated_limits", "table", "tone", "transients",
    "verdicts",
]
