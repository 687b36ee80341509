"""The instrument `noise`: what rounding the signals adds, predicted and measured."""

from streamhost.measure.rounding.result import DynamicRange, OutputNoise, RoundingNoise, SignalNoise, SourceNoise
from streamhost.measure.rounding.rounding_noise import noise

__all__ = ["DynamicRange", "OutputNoise", "RoundingNoise", "SignalNoise", "SourceNoise", "noise"]
