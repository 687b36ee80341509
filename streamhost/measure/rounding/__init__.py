"""The instrument `noise`: what rounding the signals adds, predicted and measured."""

from streamhost.measure.rounding.result import OutputNoise, RoundingNoise
from streamhost.measure.rounding.rounding_noise import noise

__all__ = ["OutputNoise", "RoundingNoise", "noise"]
