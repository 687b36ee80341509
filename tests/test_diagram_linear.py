"""State spaces and transfer functions, held against node-by-node evaluation, exact series and closed forms."""

from fractions import Fraction
from itertools import islice

import numpy as np
import pytest
from diagram_evaluator import evaluate
from diagram_examples import (
    all_pole_lattice,
    comb,
    coupled,
    direct_1,
    direct_2,
    fir,
    running_sum,
    second_order,
    transposed_2,
)
from hypothesis import given
from hypothesis import strategies as st
from random_diagrams import COARSE, diagrams

from streamhost.diagram import Builder, Diagram, minus
from streamhost.diagram.exact import impulse_responses
from streamhost.diagram.linear import exact_transfer_function, propagate, state_space, transfer_function
from streamhost.diagram.norms import responses_from_input, responses_to_output
from streamhost.diagram.transfer import float_transfer_function
from streamhost.errors import DiagramError

# Both sides are float64 sums of a few hundred terms in another order; the generator keeps poles within 0.98.
ROUNDING = 1e-9


@given(diagrams(channels=2), st.integers(0, 1), st.integers(0, 2**32))
def test_state_space_gives_what_node_by_node_evaluation_gives(diagram: Diagram, channel: int, seed: int) -> None:
    x = np.random.default_rng(seed).uniform(-1.0, 1.0, 60)
    space = state_space(diagram, channel)
    state, found = np.zeros(len(space.A)), []
    for sample in x:
        found.append(space.C @ state + space.D[:, 0] * sample)
        state = space.A @ state + space.B[:, 0] * sample
    values = evaluate(diagram, x, channel)
    np.testing.assert_allclose(found, values[:, list(diagram.outputs)], rtol=0, atol=ROUNDING * np.abs(values).max())


@given(diagrams())
def test_responses_from_the_input_are_what_an_impulse_gives_at_every_node(diagram: Diagram) -> None:
    values = evaluate(diagram, np.eye(1, 80)[0])
    np.testing.assert_allclose(responses_from_input(diagram, frames=80), values, rtol=0,
                               atol=ROUNDING * np.abs(values).max())


@given(diagrams(), st.data())
def test_responses_to_an_output_are_what_an_error_at_each_source_gives(diagram: Diagram, data: st.DataObject) -> None:
    sources = data.draw(st.lists(st.integers(0, len(diagram.nodes) - 1), min_size=1, max_size=4, unique=True))
    output = data.draw(st.integers(0, len(diagram.outputs) - 1))
    found = responses_to_output(diagram, sources, output=output, frames=50)
    for column, source in enumerate(sources):
        values = evaluate(diagram, np.zeros(50), errors={source: np.eye(1, 50)[0]})
        np.testing.assert_allclose(found[:, column], values[:, diagram.outputs[output]], rtol=0,
                                   atol=ROUNDING * np.abs(values).max())


@given(diagrams())
def test_transfer_function_is_the_transform_of_the_impulse_response(diagram: Diagram) -> None:
    # Poles within 0.98: after 4096 frames, and polynomials in the frame from the loops in cascade, nothing is left.
    h = responses_from_input(diagram, frames=4096)
    spectrum = np.fft.rfft(h[:, list(diagram.outputs)], axis=0)[::64]
    found = transfer_function(diagram).response(np.linspace(0.0, np.pi, 2049)[::64])[..., 0]
    np.testing.assert_allclose(found, spectrum, rtol=0, atol=1e-8 * np.abs(h).sum(axis=0).max())


@given(diagrams(max_nodes=16, step=COARSE))
def test_exact_transfer_function_expands_into_the_exact_impulse_response(diagram: Diagram) -> None:
    exact = exact_transfer_function(diagram)
    assert exact.denominator[0] == 1
    frames = list(islice(impulse_responses(diagram), 2 * diagram.counts().delays + 2))
    for output, (numerator,) in enumerate(exact.numerators):
        series: list[Fraction] = []
        for n in range(len(frames)):
            fed_back = sum(c * series[n - k] for k, c in enumerate(exact.denominator[1:n + 1], start=1))
            series.append((numerator[n] if n < len(numerator) else Fraction(0)) - fed_back)
        assert series == [frame[output] for frame in frames]


@given(diagrams(step=COARSE))
def test_transfer_function_by_fft_agrees_with_the_rounded_exact_one(diagram: Diagram) -> None:
    w = np.linspace(0.0, np.pi, 17)
    exact, found = transfer_function(diagram).response(w), float_transfer_function(diagram).response(w)
    # Before common factors are divided out, a pole at 0.98 repeated in a few loops may cost six digits.
    np.testing.assert_allclose(found, exact, rtol=0, atol=1e-7 * max(np.abs(exact).max(), 1.0))


# --- by hand


def test_states_are_in_order_of_nodes_and_newest_first() -> None:
    b = Builder()
    x = b.input()
    late = b.delay("late", n=3)
    t = b.taps(x, "h", [1.0, 2.0, 4.0])
    late.takes(t)
    b.output(late)
    space = state_space(b.build())
    # late holds t of 1, 2 and 3 frames ago, the taps x of 1 and 2 frames ago.
    assert space.A.tolist() == [[0, 0, 0, 2, 4], [1, 0, 0, 0, 0], [0, 1, 0, 0, 0], [0, 0, 0, 0, 0], [0, 0, 0, 1, 0]]
    assert space.B.tolist() == [[1], [0], [0], [1], [0]]
    assert space.C.tolist() == [[0, 0, 1, 0, 0]]
    assert space.D.tolist() == [[0]]


def test_inputs_and_outputs_are_in_order_of_creation() -> None:
    b = Builder()
    left, right = b.input("left"), b.input("right")
    b.output(b.sum(left, minus(right)), "side")
    b.output(b.gain(right, "g", 0.5), "half")
    assert state_space(b.build()).D.tolist() == [[1, -1], [0, 0.5]]


def test_each_channel_has_its_own_coefficients() -> None:
    b = Builder()
    b.output(b.gain(b.input(), "g", [0.5, 0.25]))
    diagram = b.build()
    assert [state_space(diagram, channel).D.item() for channel in (0, 1)] == [0.5, 0.25]
    with pytest.raises(DiagramError, match=r"Channel 2 was asked for; the diagram has coefficients for 2, counted"):
        state_space(diagram, 2)


def test_a_residue_is_minus_the_error_of_its_register_and_nothing_without_one() -> None:
    b = Builder()
    y = b.round(b.input(), "register")
    b.output(b.sum(y, b.residue(y)))
    diagram = b.build()
    assert propagate(diagram).G[:, 0].tolist() == [1, 1, 0, 1, 1]
    # Register plus what it dropped: the error is gone.
    assert propagate(diagram, sources=[1]).E[:, 0].tolist() == [0, 1, -1, 0, 0]


@pytest.mark.parametrize("form", [direct_1, direct_2, transposed_2])
def test_forms_of_a_biquad_have_exactly_its_coefficients(form: type[object]) -> None:
    b, a = [0.1, -0.3, 0.7], [1.0, -1.9, 0.95]
    found = transfer_function(form(b, a))  # type: ignore[call-arg, arg-type]
    assert found.numerators[0, 0].tolist() == b
    assert found.denominator.tolist() == a


def test_coupled_form_has_its_poles() -> None:
    found = transfer_function(coupled(0.9, 0.7))
    # v = r sin(angle) z^-1 / (1 - 2 r cos(angle) z^-1 + r^2 z^-2); the products r cos, r sin are rounded once.
    np.testing.assert_allclose(found.denominator, second_order(0.9, 0.7), rtol=1e-15)
    np.testing.assert_allclose(found.numerators[0, 0], [0.0, 0.9 * np.sin(0.7)], rtol=1e-15)


def test_all_pole_lattice_of_the_textbook_example() -> None:
    # Oppenheim & Schafer, lattice example A(z) = 1 - 0.9 z^-1 + 0.64 z^-2 - 0.576 z^-3, from memory;
    # k in the convention a_M = +k_M, printed to nine digits.
    found = transfer_function(all_pole_lattice([-0.672757475, 0.181974907, -0.576]))
    np.testing.assert_allclose(found.denominator, [1, -0.9, 0.64, -0.576], atol=1e-9)
    assert found.numerators[1, 0].tolist() == [1, 0, 0, 0]
    # The backward output is the all-pass: the denominator reversed.
    np.testing.assert_array_equal(found.numerators[0, 0], found.denominator[::-1])


def test_running_sum_has_the_transfer_function_of_its_fir() -> None:
    exact = exact_transfer_function(running_sum(1024))
    assert exact.denominator == (1,)
    assert exact.numerators == (((1,) * 1024,),)


def test_common_factor_of_several_outputs_is_only_what_all_share() -> None:
    b = Builder()
    x, d = b.input(), b.delay("d")
    y = b.sum(x, b.gain(d, "a", 0.5), label="y")
    d.takes(y)
    b.output(y, "recursive")
    b.output(b.sum(y, minus(b.gain(d, "b", 0.5))), "restored")
    exact = exact_transfer_function(b.build())
    assert exact.denominator == (1, Fraction(-1, 2))
    assert exact.numerators == (((1,),), ((1, Fraction(-1, 2)),))


def test_output_that_nothing_reaches_is_zero_over_one() -> None:
    b = Builder()
    b.input()
    d = b.delay("d")
    d.takes(b.gain(d, "a", 0.5))
    b.output(d)
    exact = exact_transfer_function(b.build())
    assert (exact.numerators, exact.denominator) == ((((),),), (1,))
    assert transfer_function(b.build()).response(0.5).tolist() == [[0]]


def test_long_loop_is_one_power_of_the_delay() -> None:
    found = transfer_function(comb(1024, 0.75))
    assert np.flatnonzero(found.denominator).tolist() == [0, 1024]
    assert found.denominator[-1] == -0.75
    assert found.numerators.tolist() == [[[1.0] + [0.0] * (found.numerators.shape[2] - 1)]]


def test_exact_transfer_function_that_would_take_too_long_is_refused_and_float64_named() -> None:
    diagram = comb(64, 1.0 / 3.0)
    assert len(exact_transfer_function(diagram).denominator) == 65
    with pytest.raises(DiagramError, match=r"has 64 states, too many .* transfer_function gives it in float64"):
        exact_transfer_function(diagram, most_work=10.0)


def test_values_at_points_of_any_shape() -> None:
    found = transfer_function(direct_1([1.0, 0.5], [1.0, -0.5]))
    z = np.array([[2.0, 1j], [-1.0, 0.75 + 0.5j]])
    np.testing.assert_allclose(found.at(z)[..., 0, 0], (z + 0.5) / (z - 0.5), rtol=1e-14)
    assert found.response(np.pi / 2).shape == (1, 1)


def test_moving_average_has_its_nulls_and_first_side_lobe() -> None:
    # Dirichlet kernel, from memory: nulls at k / M of the rate; first side lobe of M = 8: -12.797 dB at 1.438 / M,
    # of M = 64: -13.254 dB at 1.4304 / M (computed on a fine grid, to the digits printed).
    for length, lobe_db, lobe_at in ((8, -12.797, 1.438), (64, -13.254, 1.4304)):
        found = transfer_function(fir(np.full(length, 1.0 / length)))
        nulls = 2.0 * np.pi * np.arange(1, length // 2 + 1) / length
        assert np.abs(found.response(nulls)).max() < 1e-14  # rounding of at most 64 terms of 1 / length
        w = np.linspace(2.0 * np.pi / length, 4.0 * np.pi / length, 20001)
        magnitude = np.abs(found.response(w))[:, 0, 0]
        assert 20.0 * np.log10(magnitude.max()) == pytest.approx(lobe_db, abs=5e-4)
        assert w[magnitude.argmax()] * length / (2.0 * np.pi) == pytest.approx(lobe_at, abs=5e-4)
