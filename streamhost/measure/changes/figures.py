"""Figures of a deviation after a change, of many columns at once."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.quasi_peak import quasi_peaks, weighted_468

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Figures:
    """Of each column: the largest magnitude; the energy, 1.0 = that of a full-scale sine of 1 s; frames until it stays within
    the noise, as many as there are where it does not; the quasi-peak, 1.0 = that of a full-scale sine of 1 kHz."""

    peak: FloatArray
    energy: FloatArray
    settling: NDArray[np.int64]
    click: FloatArray


def figures(deviation: FloatArray, noise: float, rate: float) -> Figures:
    """Of a deviation (frames, columns) from the frame of the change on. What is at most `noise` in magnitude is within it.

    The energy is that up to where it stays there. A deviation that is not finite is infinite in all figures.
    """
    finite = np.isfinite(deviation).all(axis=0)
    held = np.where(finite, deviation, 0.0)
    size = np.abs(held)
    beyond = size > noise
    settling = np.where(beyond.any(axis=0), len(size) - np.argmax(beyond[::-1], axis=0), 0)
    until = np.arange(len(size))[:, None] < settling
    energy = 2.0 / rate * np.sum(np.square(held), axis=0, where=until)
    return Figures(
        peak=np.where(finite, size.max(axis=0), np.inf), energy=np.where(finite, energy, np.inf),
        settling=np.where(finite, settling, len(size)),
        click=np.where(finite, click(held, rate), np.inf),
    )


def click(x: FloatArray, rate: float) -> FloatArray:
    """The quasi-peak of each column of (frames, columns), silent before; 1.0 = that of a full-scale sine of 1 kHz."""
    return np.asarray(np.sqrt(2.0) * quasi_peaks(weighted_468(x, rate), rate))


def heard_click(rest: FloatArray, heard: FloatArray, rate: float) -> float:
    """The largest of an output (frames, columns) that was at `rest` (columns,) before; that the run ends is no click."""
    return float(click(heard - rest, rate).max()) if np.isfinite(heard).all() else np.inf
