"""Levels of responses."""

import numpy as np


def decibels(response: object) -> np.ndarray:
    """Of amplitudes, complex or not; of 0 minus infinity."""
    with np.errstate(divide="ignore"):
        return 20 * np.log10(np.abs(response))
