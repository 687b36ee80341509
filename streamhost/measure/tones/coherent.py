"""Tones that have a whole number of periods in the window, and where in the pass band they lie.

A window is an odd number of frames, and has no divisor in common with a tone's number of periods, which is odd too: then no
two frames of it have the same phase, nor opposite ones. With opposite ones, as in a window of a power of two, all that a
symmetric rounding does would lie in every other bin, and what is noise would look like lines.
"""

from math import gcd

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.bands import audio_band
from streamhost.measure.deviation import Responses

FloatArray = NDArray[np.float64]

REFERENCE_HZ = 997.0
"""AES17-2015 measures at 997 Hz."""

PASSES = 10.0 ** (-3.0 / 20.0)
QUICKER = 4
LEAST_FRAMES = 1 << 10
MOST_FACTORS = 16
EDGE_BINS = 4
"""From an edge of the band: a line is three bins wide."""


def window_frames(rate: float, quick: bool) -> int:
    """The least product of threes and fives that lasts a second; quick: a quarter of one."""
    least = max(LEAST_FRAMES, rate / (QUICKER if quick else 1))
    products = (3**threes * 5**fives for threes in range(MOST_FACTORS) for fives in range(MOST_FACTORS))
    return int(min(product for product in products if product >= least))


def tone_bins(responses: Responses, window: int) -> tuple[int, ...]:
    """The pass band's lowest bin, those nearest 997 Hz and a third of its upper edge, and the highest.

    The pass band is where |H| is within 3 dB of its maximum in the audio band; of a third of the upper edge the third
    harmonic still lies in it. Empty where nothing passes.
    """
    rate = responses.realization.rate
    spacing = rate / window
    low, high = audio_band(rate) or (spacing, rate / 2.0)
    within = range(round(low / spacing) + EDGE_BINS, round(min(high, rate / 2.0) / spacing) - EDGE_BINS)
    bins = np.array([bin for bin in within if bin % 2 and gcd(bin, window) == 1], np.float64)
    if not len(bins):
        return ()
    magnitude = responses.magnitudes(bins * spacing)[1]
    if not np.isfinite(magnitude).all() or not magnitude.any():
        return ()
    passed = bins[magnitude >= PASSES * magnitude.max()]
    wanted = [passed[0], REFERENCE_HZ / spacing, passed[-1] / 3.0, passed[-1]]
    return tuple(sorted({int(passed[np.abs(passed - bin).argmin()]) for bin in wanted}))
