"""What all low-noise forms have in common: they are the filter, a constant is one gain, and some filters are refused."""

import numpy as np
import pytest
from form_filters import rounding_bound
from hypothesis import given, settings
from hypothesis import strategies as st
from low_noise_forms import RATE, by_definition, in_float64, random_filter, section

from streamhost import Filter
from streamhost.diagram import Counts
from streamhost.errors import StructureError
from streamhost.structures import build

TWO_REGISTERS = ("kingsbury", "zoelzer")
STATES = ("normal", "minimum-noise")
ALL = ("delta", *TWO_REGISTERS, *STATES)
SEEDS = st.integers(0, 2**32 - 1)
REFUSED = [
    *((name, [1.0, 0.5], [1.0, -1.0], "is not above 0") for name in TWO_REGISTERS),
    *((name, [1.0, 0.5, 0.25], [1.0, -2.5, 1.0], "is not above 0") for name in TWO_REGISTERS),
    *((name, [1.0, 0.5, 0.25], [1.0], "it has no recursion") for name in TWO_REGISTERS),
    *((name, [1.0], [1.0, 0.0, 0.0, 0.5], "it is of order 3, and there are two registers at most") for name in TWO_REGISTERS),
    ("normal", [1.0, 0.5, 0.25], [1.0, -1.0, 0.25], "it has a double pole, which has no normal form"),
    ("normal", [1.0, 0.5, 0.25], [1.0], "it has no recursion"),
    ("minimum-noise", [1.0, 0.5, 0.25], [1.0], "it has no recursion"),
    ("normal", [1.0, 0.5, 0.25], [1.0, -1.0, 1.0], "it has a pole on or outside the unit circle"),
    ("minimum-noise", [1.0, 0.5, 0.25], [1.0, -2.5, 1.0], "it has a pole on or outside the unit circle"),
    ("normal", [1.0], [1.0, -0.5, 0.25, -0.1], "it is of order 3, and the normal form is one of first and second"),
    ("minimum-noise", [1.0], [1.0, *[0.0] * 12, 0.1], "it is of order 13, whose matrix would have 169"),
    ("delta", [1.0, 0.5], [1.0], "it has no recursion"),
    ("delta", [1.0], [1.0, *[0.0] * 12, 0.1], "it is of order 13, and the delta form is drawn up to order 12"),
]


@pytest.mark.parametrize("name", ALL)
@settings(max_examples=10)
@given(st.integers(1, 12), SEEDS)
def test_a_cascade_in_float64_agrees_with_scipy(name: str, order: int, seed: int) -> None:
    built = build(random_filter(order, seed), form=name)
    x = np.random.default_rng(seed).uniform(-1, 1, 60)
    wanted = by_definition(built.sections, x)
    assert np.max(np.abs(in_float64(built.diagram, x) - wanted)) <= rounding_bound(built.diagram)


@pytest.mark.parametrize("name", ALL)
def test_a_constant_is_one_gain(name: str) -> None:
    diagram = build(section([0.5], [1.0]), form=name).diagram
    assert diagram.counts() == Counts(1, 0, 0)


@pytest.mark.parametrize(("name", "b", "a", "reason"), REFUSED)
def test_what_is_refused(name: str, b: list[float], a: list[float], reason: str) -> None:
    with pytest.raises(StructureError, match=reason):
        build(Filter.from_coefficients(b, a, rate=RATE), form=name, decomposition="whole")
