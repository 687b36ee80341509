"""The coupled form: its loop, its zeros, its noise, its overflow, and what it refuses."""

from fractions import Fraction

import numpy as np
import pytest
from drawing_reader import crossings, faults_of, page_of
from drawn_forms import cascade, sums
from form_filters import RATE, coefficients, rounding_bound
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import signal
from structure_evaluator import response, run, series

from streamhost.diagram import Counts
from streamhost.diagram.norms import norms_from_input
from streamhost.drawing import svg
from streamhost.errors import StructureError
from streamhost.filters import Filter
from streamhost.formats import Fixed
from streamhost.program.run import lower, run_definition
from streamhost.structures import Built, build
from streamhost.structures.division import ratio_of
from streamhost.structures.forms.coupled import power_of


def drawn(b: list[float], a: list[float]) -> Built:
    return build(Filter.from_coefficients(b, a, rate=RATE), form="coupled", decomposition="whole")


def pair(r: float, theta: float) -> list[float]:
    return [1.0, -2 * r * np.cos(theta), r * r]


@settings(max_examples=40)
@given(st.integers(-7, 7), st.integers(1, 3), st.lists(st.integers(-31, 31), min_size=1, max_size=3))
def test_it_is_the_filter_exactly(code: int, octave: int, codes: list[int]) -> None:
    """With p a multiple of 1/8 and q a power of two every coefficient is exact in float64."""
    p, q = Fraction(code, 8), Fraction(1, 2**octave)
    b = [value / 16 for value in codes]
    a = [1.0, float(-2 * p), float(p * p + q * q)]
    built = drawn(b, a)
    found = coefficients(built.diagram)
    assert (found["p"], found["q"], found["d"]) == (float(p), float(q), b[0])
    assert response(built.diagram, 30, Fraction) == series(b, a, 30)


@settings(max_examples=40)
@given(st.integers(-9, 9).filter(bool), st.lists(st.integers(-31, 31), min_size=1, max_size=2))
def test_a_real_pole_alone_exactly(code: int, codes: list[int]) -> None:
    """Inside the circle, on it and outside."""
    b, a = [value / 16 for value in codes], [1.0, -code / 8]
    assert response(drawn(b, a).diagram, 30, Fraction) == series(b, a, 30)


def test_poles_on_the_circle_are_carried_and_not_scaled() -> None:
    built = drawn([1.0], [1.0, -1.2, 1.0])
    assert (coefficients(built.diagram)["p"], coefficients(built.diagram)["q"]) == pytest.approx((0.6, 0.8), abs=1e-15)
    assert [node for node in built.diagram.nodes if node.kind == "shift"] == []


@pytest.mark.parametrize("decomposition", ["whole", "cascade"])
@settings(max_examples=12)
@given(st.integers(1, 12), st.integers(0, 2**32 - 1))
def test_stable_filters_in_float64_agree_with_scipy(decomposition: str, order: int, seed: int) -> None:
    """Whole of order 1 and 2, a cascade of up to six."""
    order = order if decomposition == "cascade" else 1 + order % 2
    rng = np.random.default_rng(seed)
    pairs = order // 2
    poles = 0.85 * rng.uniform(0.1, 1, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    zeros = rng.uniform(0.1, 1, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    real = rng.uniform(-0.85, 0.85, (2, order % 2))
    z, p = [*zeros, *zeros.conj(), *real[0]], [*poles, *poles.conj(), *real[1]]
    diagram = build(Filter.from_zeros_poles(z, p, 0.7, rate=RATE), form="coupled", decomposition=decomposition).diagram
    x = rng.uniform(-1, 1, 60)
    found = [frame["output"] for frame in run(diagram, x.tolist(), float)]
    wanted = signal.sosfilt(signal.zpk2sos(z, p, 0.7), x)
    np.testing.assert_allclose(found, wanted, rtol=0, atol=rounding_bound(diagram))


def test_counts_of_a_pair_and_of_a_pole() -> None:
    """The poles of a pair take 4 multiplications, 2 additions and the input's (textbook count, from memory)."""
    format = Fixed("Q8.24", coefficients={"bits": 32})
    two, one = drawn([0.5, 0.25, 0.125], pair(0.9, 0.5)), drawn([0.5, 0.25], [1.0, -0.5])
    assert (two.diagram.counts(), one.diagram.counts()) == (Counts(4 + 3, 2 + 1 + 2, 2), Counts(3, 2, 1))
    assert (len(two.diagram.slots), len(one.diagram.slots)) == (5, 3)
    assert [len(lower(built.diagram, format).roundings) for built in (two, one)] == [3, 2]


# r, angle, and the noise power of a rounding in both states, summed over both: 2 / (1 - r^2). Rader & Gold 1967; Oppenheim
# & Schafer, ch. 6 (from memory; recomputed by a Lyapunov solution).
NOISE = [(0.9, 0.785398163, 10.5263), (0.99, 0.785398163, 100.5025), (0.99, 0.1, 100.5025), (0.99, 0.130899694, 100.5025)]


@pytest.mark.parametrize(("r", "theta", "wanted"), NOISE)
def test_the_noise_of_the_states_does_not_depend_on_the_angle(r: float, theta: float, wanted: float) -> None:
    a = drawn([1.0], pair(r, theta)).diagram.state_space().A
    power, k = a, np.eye(2)
    for _ in range(20):
        k, power = k + power @ k @ power.T, power @ power
    assert np.trace(k) == pytest.approx(wanted, abs=6e-5)


@pytest.mark.parametrize("a", [pair(0.9, 0.5), pair(0.99, 0.01), pair(0.5, 3.0), [1.0, -0.9], [1.0, 0.3]], ids=str)
def test_no_state_has_more_power_than_the_input(a: list[float]) -> None:
    built = drawn([1.0, 0.5], a)
    states = [i for i, node in enumerate(built.diagram.nodes) if node.kind == "delay"]
    norms = norms_from_input(built.diagram, nodes=states).l2
    shift = sum(node.k for node in built.diagram.nodes if node.kind == "shift")
    power = power_of(ratio_of(built.sections[0]))
    assert power is not None and norms[0] ** 2 == pytest.approx(float(power) * 4.0**shift, rel=1e-9)
    assert max(norms) == norms[0] <= 1.0
    assert shift == 0 or norms[0] > 0.5


def test_a_wrapping_overflow_dies_away() -> None:
    """|A| = r < 1: Barnes & Fam, IEEE CAS-24 (1977), as quoted. What is left is what roundings of half a step keep up."""
    rng = np.random.default_rng(5)
    format = Fixed("Q1.15", coefficients={"bits": 32}, overflow="wrap")
    for _ in range(12):
        r, theta = rng.uniform(0.3, 0.95), rng.uniform(0.05, 3.1)
        built = drawn([0.0, 0.5, 0.25], pair(r, theta))
        x = np.zeros((600, 1))
        x[:40, 0] = rng.choice([-1.0, 1.0 - 2.0**-15], 40)
        y = run_definition(lower(built.diagram, format), x)[:, 0, 0]
        found = coefficients(built.diagram)
        kept = np.hypot(found["c1"], found["c2"]) * np.sqrt(0.5) / (1 - r - 2.0**-20) + 0.5
        assert np.abs(y[-100:]).max() <= kept * 2.0**-15, (r, theta)


def test_an_overflow_does_happen_there() -> None:
    """Or else the test above would show nothing: the same input wraps the direct form for ever."""
    x = np.zeros((600, 1))
    x[:40, 0] = np.random.default_rng(5).choice([-1.0, 1.0 - 2.0**-15], 40)
    filter = Filter.from_coefficients([0.0, 0.5, 0.25], [1.0, -1.8, 0.9], rate=RATE)
    format = Fixed("Q1.15", coefficients={"bits": 32}, overflow="wrap")
    y = {name: run_definition(lower(build(filter, form=name).diagram, format), x)[-100:, 0, 0]
         for name in ("coupled", "direct-1")}
    assert np.abs(y["coupled"]).max() < 0.001 and np.abs(y["direct-1"]).max() > 0.1


@pytest.mark.parametrize(("b", "a", "reason"), [
    ([1.0], [1.0, -1.3, 0.42], "its two poles are real"),
    ([1.0], [1.0, -1.0, 0.25], "its two poles are real"),
    ([1.0], [1.0, -0.5, 0.3, 0.1], "its recursion is of order 3, and a pair of coupled states has order 2"),
    ([1.0, 0.5, 0.5], [1.0, -0.5], "its numerator is of order 2, higher than that of its recursion, 1"),
    ([1.0, 0.5], [1.0], "it has no recursion"),
])
def test_what_it_refuses(b: list[float], a: list[float], reason: str) -> None:
    with pytest.raises(StructureError, match=f'form "coupled" cannot carry the filter: {reason}'):
        drawn(b, a)


def test_poles_that_are_nearly_real_are_a_hazard() -> None:
    (said,) = drawn([1.0, 0.5, 0.25], pair(0.9, 0.001)).hazards
    assert "nearly a double real one" in said and "magnifies its rounding" in said
    assert drawn([1.0, 0.5, 0.25], pair(0.9, 0.1)).hazards == ()


@pytest.mark.parametrize("sections", [1, 2, 3])
def test_a_cascade_fits_the_page_without_a_crossing(sections: int) -> None:
    for odd in (False, True):
        diagram = cascade("coupled", sections, odd=odd)
        for marks in (set(), sums(diagram)):
            page = page_of(text := svg(diagram, rounded=marks))
            assert faults_of(text, diagram) == []
            assert crossings(page) == 0 and page.scale >= 0.8
    assert cascade("coupled", 5).hints.general is not None
