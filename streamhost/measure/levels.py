"""Powers and peaks as decibels: 0 dBFS is a full-scale sine (AES17-2015, 3.12.1; IEC 61606-3:2008, 3.4)."""

from math import inf, log10


def decibels(power_ratio: float) -> float:
    """10 lg of a ratio of powers; minus infinity for 0."""
    return 10.0 * log10(power_ratio) if power_ratio > 0.0 else -inf


def power_dbfs(power: float) -> float:
    """A mean square, in units of full scale squared, as dBFS: the rms plus 3.01 dB."""
    return decibels(2.0 * power)


def peak_dbfs(peak: float) -> float:
    """The largest magnitude of a sample as dBFS: that of a full-scale sine, 1.0, is 0."""
    return 20.0 * log10(peak) if peak > 0.0 else -inf
