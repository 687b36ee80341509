"""Filters of many kinds, one or two of which every form can carry, and each form's share of them."""

from functools import cache

import numpy as np
from error_norms import norms_to_output

from streamhost import Filter, design
from streamhost.diagram import Diagram
from streamhost.diagram.norms import powers_from_input, responses_to_output
from streamhost.errors import StructureError
from streamhost.structures import Built, build

RATE = 48000
EPSILON = 2.0**-52
DIRECT = ("direct-1", "direct-1-swapped", "direct-2", "transposed-1", "transposed-2")
"""The forms that draw any numerator and denominator as they are written."""
NUMERATOR_FIRST = ("direct-1", "transposed-2")
"""Those whose numerator stands before the recursion."""


def fir(*taps: float) -> Filter:
    return Filter.from_coefficients(taps, rate=RATE)


@cache
def filters() -> dict[str, Filter]:
    """By what they are. Recursive ones are in zeros and poles or in sections; all are stable."""
    rng = np.random.default_rng(4)
    half = rng.uniform(-0.3, 0.3, 5).tolist()
    return {
        "constant": fir(0.5),
        "one pole": Filter.from_coefficients([0.25], [1.0, -0.75], rate=RATE),
        "first-order all-pass": Filter.from_coefficients([-0.5, 1.0], [1.0, -0.5], rate=RATE),
        "low-pass at 1 kHz": design("low-pass", rate=RATE, frequency=1000, q=0.707),
        "high-pass at 100 Hz": design("high-pass", rate=RATE, frequency=100, q=0.707),
        "notch at 500 Hz": design("notch", rate=RATE, frequency=500, q=5),
        "peak at 3 kHz": design("peak", rate=RATE, frequency=3000, gain_db=6, q=1),
        "butterworth 3, half-band": design("butterworth", rate=RATE, response="low-pass", order=3, frequency=12000),
        "elliptic 5": design("elliptic", rate=RATE, response="low-pass", order=5, frequency=6000, ripple_db=0.5,
                             stopband_db=50),
        "chebyshev 4": design("chebyshev-1", rate=RATE, response="high-pass", order=4, frequency=5000, ripple_db=1),
        "butterworth band-pass 4": design("butterworth", rate=RATE, response="band-pass", order=2,
                                          frequency=[2000, 5000]),
        "taps": fir(*rng.uniform(-0.4, 0.4, 6).tolist()),
        "even symmetry, odd length": fir(*half, *half[-2::-1]),
        "even symmetry, even length": fir(*half, *half[::-1]),
        "odd symmetry, even length": fir(*half, *(-value for value in half[::-1])),
        "moving average": design("moving-average", rate=RATE, length=8),
    }


@cache
def carried(form: str, decomposition: str) -> tuple[str, ...]:
    """The names of the filters that a form carries in a decomposition."""
    return tuple(name for name in filters() if _built(form, decomposition, name) is not None)


@cache
def built(form: str, decomposition: str, name: str) -> Built:
    return build(filters()[name], form=form, decomposition=decomposition)


def _built(form: str, decomposition: str, name: str) -> Built | None:
    try:
        return built(form, decomposition, name)
    except StructureError as error:
        assert "cannot carry" in str(error)
        return None


def coefficients(diagram: Diagram) -> dict[str, float]:
    """Of the first channel, by their labels."""
    return {slot.label: value for slot, value in zip(diagram.slots, diagram.values[:, 0].tolist(), strict=True)}


def rounding_bound(diagram: Diagram, frames: int | None = None) -> float:
    """The most that one rounding of each node, and of each coefficient, of a signal of at most 1 makes at the output.

    In that many frames, where they are given: what a running sum rounds never dies out. A node's value is taken as six
    times what white noise gives it. Doubled for scipy's own, of the same kind.
    """
    nodes = range(len(diagram.nodes))
    values = 6.0 * np.sqrt(powers_from_input(diagram))
    if frames is None:
        to_output = norms_to_output(diagram, nodes).l1
    else:
        to_output = np.abs(responses_to_output(diagram, nodes, frames=frames)).sum(axis=0)
    return 2.0 * 2.0 * EPSILON * float(np.sum(values * to_output))
