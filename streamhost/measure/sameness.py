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


def different(filters: Sequence[Filter]) -> list[int]:
    """The places of the filters whose transfer function is not that of the first; rates are equal.

    Responses are compared over 0 to half the rate, 48 points an octave and 20 octaves down.
    """
    first = filters[0]
    hertz = refined(breakpoints([], 0.0, pi), POINTS_AN_OCTAVE) * first.rate / (2.0 * pi)
    hertz = np.minimum(hertz, first.rate / 2.0)
    asked = first.response(hertz)
    known = np.isfinite(asked)
    allowed = RELATIVE * float(np.abs(asked[known]).max(initial=0.0))
    return [place for place, other in enumerate(filters)
            if other.factors != first.factors and not _near(other.response(hertz), asked, allowed)]


def _near(response: ComplexArray, asked: ComplexArray, allowed: float) -> bool:
    known = np.isfinite(asked)
    return bool((np.isfinite(response) == known).all() and (np.abs(response - asked)[known] <= allowed).all())
