"""Frequencies so dense around poles that no detail of a response is stepped over, and integrals on them.

Frequencies are in radians a frame, 0 to pi.
"""

from collections.abc import Callable, Iterable

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

NEAREST = 1e-9
"""A pole nearer to the circle than this is taken to be so far from it."""

OCTAVES = 20
ORDER = 8


def breakpoints(poles: Iterable[complex], low: float, high: float) -> FloatArray:
    """Points from `low` to `high`, both among them.

    Octaves down from pi; and around each pole's angle, in steps that double from half its distance from the circle.
    """
    points = [np.array([low, high]), np.pi * 2.0 ** -np.arange(float(OCTAVES))]
    for angle, distance in {(abs(float(np.angle(pole))), max(abs(1.0 - abs(pole)), NEAREST)) for pole in poles}:
        steps = int(np.ceil(np.log2(2.0 * np.pi / distance))) + 1
        offsets = distance / 2.0 * 2.0 ** np.arange(float(max(steps, 1)))
        points.append(angle + np.concatenate((-offsets, [0.0], offsets)))
    together = np.concatenate(points)
    return np.unique(together[(together >= low) & (together <= high)])


def refined(edges: FloatArray, parts: int) -> FloatArray:
    """The edges, and between each two `parts` - 1 points at even steps."""
    steps = np.arange(parts) / parts
    return np.append((edges[:-1, None] + np.diff(edges)[:, None] * steps).ravel(), edges[-1])


def integral(density: Callable[[FloatArray], FloatArray], edges: FloatArray) -> float:
    """The integral from the first to the last of the edges, by the rule of Gauss and Legendre between each two."""
    return float(integrals(lambda w: density(w)[:, None], edges)[0])


def integrals(densities: Callable[[FloatArray], FloatArray], edges: FloatArray) -> FloatArray:
    """The same of several densities at once, which come as (frequencies, densities)."""
    nodes, weights = np.polynomial.legendre.leggauss(ORDER)
    half = np.diff(edges)[:, None] / 2.0
    points = edges[:-1, None] + half * (nodes + 1.0)
    return np.asarray((half * weights).ravel() @ densities(points.ravel()), dtype=np.float64)
