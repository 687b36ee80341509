"""How far a measured power may lie from the one that an endless signal would show."""

from math import inf

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.levels import decibels
from streamhost.measure.welch import Spectrum

OUTSIDE = 0.05


def degrees_of_freedom(spectrum: Spectrum, shares: NDArray[np.float64]) -> float:
    """Of the power in a band, as of a chi-square variable: 2 T (integral of S)^2 / integral of S^2.

    The power of a narrow band scatters more than that of a wide one (R. B. Blackman, J. W. Tukey, Bell System Technical
    Journal 37, 1958). Squares of measured bins are too large by their own scatter, which is taken out.
    """
    power = spectrum.power * shares
    square = float(power @ power) / (1.0 + spectrum.scatter)
    if square == 0.0:
        return inf
    segments = spectrum.frames / (2 * (len(power) - 1))
    return 2.0 * segments * float(power.sum()) ** 2 / square


def half_width_db(degrees: float) -> float:
    """The larger half of the 95 % interval of a power, in dB: the one upwards."""
    if degrees == inf:
        return 0.0
    from scipy.special import chdtri

    return decibels(degrees / float(chdtri(degrees, 1.0 - OUTSIDE / 2.0)))
