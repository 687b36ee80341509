"""The instrument `float_particulars`: what is particular to floating point."""

from streamhost.measure.floats.particulars import float_particulars
from streamhost.measure.floats.result import Drift, FloatParticulars, LostBits, Tail, TailState

__all__ = ["Drift", "FloatParticulars", "LostBits", "Tail", "TailState", "float_particulars"]
