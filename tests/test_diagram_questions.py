"""Whether a diagram has a loop, and whether its impulse response ends: two questions."""

from itertools import islice

import numpy as np
import pytest
from diagram_examples import direct_1, fir, running_sum
from hypothesis import given
from hypothesis import strategies as st
from random_diagrams import COARSE, KINDS, diagrams

from streamhost.diagram import Builder, Diagram, minus
from streamhost.diagram.exact import impulse_responses
from streamhost.diagram.norms import responses_from_input
from streamhost.diagram.questions import response_frames

WITHOUT_LOOPS = tuple(kind for kind in KINDS if kind != "loop")


@pytest.mark.parametrize("length", [1, 2, 64, 1024])
def test_running_sum_has_a_loop_and_ends(length: int) -> None:
    assert running_sum(length).has_loop()
    assert running_sum(length).response_ends()
    assert running_sum(length, 1.0 / 3.0).response_ends()


def test_fir_has_no_loop_and_ends() -> None:
    assert not fir(np.ones(1000)).has_loop()
    assert fir(np.ones(1000)).response_ends()


@given(diagrams(kinds=WITHOUT_LOOPS))
def test_diagrams_without_loops_end_within_their_states(diagram: Diagram) -> None:
    assert not diagram.has_loop()
    assert diagram.response_ends()
    states = diagram.counts().delays
    assert not responses_from_input(diagram, frames=states + 20)[states + 1:].any()


@given(diagrams(kinds=WITHOUT_LOOPS, step=COARSE) | st.builds(running_sum, st.integers(1, 40)))
def test_a_response_that_ends_has_its_last_frame_where_it_is_said(diagram: Diagram) -> None:
    frames = response_frames(diagram)
    assert frames is not None
    exact = list(islice(impulse_responses(diagram), diagram.counts().delays + 3))
    assert not any(map(any, exact[frames:]))
    assert frames == 0 or any(exact[frames - 1])


def test_a_response_that_does_not_end_has_no_last_frame() -> None:
    assert response_frames(direct_1([1.0], [1.0, -0.5])) is None


def test_the_longest_of_all_channels_and_outputs_counts() -> None:
    b = Builder()
    x = b.input()
    b.output(b.gain(x, "now", [1.0, 1.0]), "now")
    b.output(b.gain(b.delay("d", x, 5), "late", [0.0, 1.0]), "late")
    assert response_frames(b.build()) == 6


def test_recursion_does_not_end() -> None:
    rng = np.random.default_rng(12)
    assert not direct_1(rng.normal(size=13).tolist(), [1.0, *(0.1 * rng.normal(size=12))]).response_ends()
    assert not direct_1([1.0], [1.0, -1e-300]).response_ends()


def test_zero_that_cancels_the_pole_exactly_ends_and_nearly_does_not() -> None:
    # (1 - 0.25 z^-2) / (1 - 0.5 z^-1) = 1 + 0.5 z^-1 without remainder; the next float64 beside 0.25 leaves one.
    assert direct_1([1.0, 0.0, -0.25], [1.0, -0.5]).response_ends()
    assert not direct_1([1.0, 0.0, -np.nextafter(0.25, 1.0)], [1.0, -0.5]).response_ends()


def test_loop_through_a_coefficient_of_zero_is_a_loop_that_ends() -> None:
    assert direct_1([1.0, 2.0], [1.0, 0.0]).has_loop()
    assert direct_1([1.0, 2.0], [1.0, 0.0]).response_ends()


def test_one_channel_that_does_not_end_is_enough() -> None:
    ending = direct_1([1.0, 0.5], [1.0, 0.0])
    assert ending.with_values(np.repeat(ending.values, 3, axis=1)).response_ends()
    values = np.repeat(ending.values, 3, axis=1)
    values[-1, 2] = 0.25
    assert not ending.with_values(values).response_ends()


def test_one_input_or_output_that_does_not_end_is_enough() -> None:
    b = Builder()
    x, z, d = b.input("x"), b.input("z"), b.delay("d")
    y = b.sum(z, b.gain(d, "a", 0.5))
    d.takes(y)
    b.output(x, "through")
    b.output(y, "recursive")
    assert not b.build().response_ends()


def test_a_loop_that_nothing_drives_ends() -> None:
    b = Builder()
    x, d = b.input(), b.delay("d")
    d.takes(b.gain(d, "a", 0.5))
    b.output(b.sum(x, d))
    assert b.build().has_loop()
    assert b.build().response_ends()


def test_error_feedback_is_a_loop_and_leaves_an_fir_ending() -> None:
    b = Builder()
    x, e = b.input(), b.delay("e")
    y = b.sum(x, minus(e), label="y")
    e.takes(b.residue(y))
    b.output(y)
    assert b.build().has_loop()
    assert b.build().response_ends()


@given(diagrams(step=COARSE, stable=False))
def test_exact_answer_agrees_with_exact_float64(diagram: Diagram) -> None:
    # Sums of products of multiples of 2^-6 are exact in float64 for the few frames of a small diagram only, so that
    # what has ended exactly must be below rounding here; the other way round nothing can be said in float64.
    if diagram.response_ends():
        states = diagram.counts().delays
        h = responses_from_input(diagram, nodes=diagram.outputs, frames=2 * states + 2)
        assert np.abs(h[states + 1:]).max(initial=0.0) <= 1e-9 * np.abs(h).max()
