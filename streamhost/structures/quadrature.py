"""Powers of filters of sections, from samples of |H|^2 that lie densest where poles are nearest the unit circle.

The circle is cut at angles at growing distances from each pole, and each piece gets the points of a Gauss-Legendre rule.
A piece is no longer than its distance from the nearest pole, so that the rule's error falls below 1e-9.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.filters.roots import roots
from streamhost.structures.division import Sections

FloatArray = NDArray[np.float64]

POINTS = 16
LEAST_DISTANCE = 1e-12


@dataclass(frozen=True, eq=False)
class Samples:
    """|H|^2 and |1/A|^2 of each section, (sections, points), at angles with weights whose sum is 1."""

    weights: FloatArray
    whole: FloatArray
    recursion: FloatArray

    def power(self, squared: FloatArray) -> float:
        """The power of white noise of power 1 behind a filter of that squared magnitude."""
        return float(self.weights @ squared)


def sampled(sections: Sections) -> Samples:
    """All sections on one grid of angles from 0 to pi."""
    poles = [complex(pole) for section in sections for pole in roots(section.a)]
    edges = _edges(poles)
    nodes, weights = np.polynomial.legendre.leggauss(POINTS)
    half = np.diff(edges)[:, np.newaxis] / 2
    angles = (edges[:-1, np.newaxis] + half * (nodes + 1)).ravel()
    w = (half * weights).ravel() / np.pi
    a = np.array([_squared(section.a, angles) for section in sections])
    b = np.array([_squared(section.b, angles) for section in sections])
    return Samples(w, b / a, 1.0 / a)


def _edges(poles: Sequence[complex]) -> FloatArray:
    found = {0.0, np.pi, *np.linspace(0.0, np.pi, 9).tolist()}
    for pole in poles:
        angle, distance = abs(float(np.angle(pole))), max(LEAST_DISTANCE, abs(1.0 - abs(pole)))
        found.add(angle)
        while distance < np.pi:
            found |= {edge for edge in (angle - distance, angle + distance) if 0.0 < edge < np.pi}
            distance *= 2.0
    return np.array(sorted(found))


def _squared(polynomial: Sequence[float], angles: FloatArray) -> FloatArray:
    """|P(e^jw)|^2, of a second-order one by its factors' distance where it would cancel."""
    z = np.exp(-1j * angles)
    squared: FloatArray = np.abs(np.polynomial.polynomial.polyval(z, np.array(polynomial))) ** 2
    return squared
