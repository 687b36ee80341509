"""The instrument `tone`: distortion, spurious lines and idle tones."""

from streamhost.measure.tones.measured_tones import tone
from streamhost.measure.tones.result import Idle, Line, Setting, Tones, WorstSpectrum

__all__ = ["Idle", "Line", "Setting", "Tones", "WorstSpectrum", "tone"]
