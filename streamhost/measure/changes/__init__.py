"""The instrument `transients`: what a change of a parameter or of the form at a frame does to the output."""

from streamhost.measure.changes.result import Trace, Transient, Transients
from streamhost.measure.changes.targets import Target, form_targets, parameter_targets, to_setting
from streamhost.measure.changes.transients_run import transients

__all__ = ["Target", "Trace", "Transient", "Transients", "form_targets", "parameter_targets", "to_setting", "transients"]
