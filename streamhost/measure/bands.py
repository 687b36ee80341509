"""The band in which noise is counted, and the share of each bin of a spectrum that lies in it."""

import numpy as np
from numpy.typing import NDArray

LOWEST, HIGHEST = 20.0, 20000.0

Band = tuple[float, float]
"""Lower and upper edge in Hz."""


def audio_band(rate: float) -> Band | None:
    """20 Hz to the lower of 20 kHz and half the rate; None where nothing lies between."""
    top = min(HIGHEST, rate / 2.0)
    return (LOWEST, top) if top > LOWEST else None


def bin_shares(bins: int, spacing: float, band: Band) -> NDArray[np.float64]:
    """How much of each bin lies in the band, 0 to 1; bin k reaches from k - 1/2 to k + 1/2 of `spacing` Hz.

    The first and the last bin are halves, so that together they fill 0 to half the rate exactly.
    """
    centres = np.arange(bins) * spacing
    low = np.maximum(centres - spacing / 2.0, 0.0)
    high = np.minimum(centres + spacing / 2.0, centres[-1])
    inside = np.minimum(high, band[1]) - np.maximum(low, band[0])
    return np.asarray(np.maximum(inside, 0.0) / (high - low), dtype=np.float64)
