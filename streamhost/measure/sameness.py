"""Whether realizations are of one filter, without which comparing them says nothing."""

from collections.abc import Sequence
from math import pi

import numpy as np
from numpy.typing import NDArray

from streamhost.filters import Filter
from streamhost.measure.frequencies import breakpoints, refined

ComplexArray = NDArray[np.complex128]

RELATIVE = 1e-9
"""Of the largest magnitude: more than float64 loses on the way from one description of a filter to another."""

POINTS_AN_OCTAVE = 48


def different(asked: Sequence[Sequence[Filter]]) -> list[int]:
    """The places at which other filters are asked for than at the first; rates are equal.

    At each place stands a filter for each channel, or one for all. Responses are compared over 0 to half the rate, 48
    points an octave and 20 octaves down.
    """
    return [place for place, filters in enumerate(asked) if not _alike(asked[0], filters)]


def _alike(first: Sequence[Filter], others: Sequence[Filter]) -> bool:
    channels = range(max(len(first), len(others)))
    pairs = {(first[min(c, len(first) - 1)], others[min(c, len(others) - 1)]) for c in channels}
    return all(_is_same(*pair) for pair in pairs)


def _is_same(first: Filter, other: Filter) -> bool:
    if other.outputs != first.outputs:
        return False
    if (other.factors, other.branches) == (first.factors, first.branches):
        return True
    hertz = refined(breakpoints([], 0.0, pi), POINTS_AN_OCTAVE) * first.rate / (2.0 * pi)
    hertz = np.minimum(hertz, first.rate / 2.0)
    asked = first.response(hertz)
    known = np.isfinite(asked)
    allowed = RELATIVE * float(np.abs(asked[known]).max(initial=0.0))
    return _near(other.response(hertz), asked, allowed)


def _near(response: ComplexArray, asked: ComplexArray, allowed: float) -> bool:
    known = np.isfinite(asked)
    return bool((np.isfinite(response) == known).all() and (np.abs(response - asked)[known] <= allowed).all())
