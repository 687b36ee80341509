"""State spaces: normal and minimum-noise. Scaling, second-order modes, least noise, and that they do not oscillate."""

import math

import numpy as np
import pytest
from form_filters import rounding_bound
from hypothesis import given, settings
from hypothesis import strategies as st
from low_noise_forms import (
    RATE,
    gramians,
    in_float64,
    low_pass,
    noise_gain,
    poles_at,
    random_filter,
    rounding_gain,
    section,
)
from scipy import signal

from streamhost import Filter, Fixed, design, realize
from streamhost.diagram import Counts
from streamhost.diagram.norms import powers_from_input
from streamhost.drawing import svg
from streamhost.measure import measure
from streamhost.program.run import lower, run_definition
from streamhost.signals import white
from streamhost.structures import build, form, modal
from streamhost.structures import gramians as digits
from streamhost.structures.division import Ratio

BOTH = ("normal", "minimum-noise")
TWO_STATES = ("direct-2", "transposed-2", "normal", "minimum-noise", "delta", "kingsbury", "zoelzer")
SEEDS = st.integers(0, 2**32 - 1)


def states_noise(filter: Filter, name: str) -> float:
    """The power at the output of roundings of power 1 in both states, of the coefficients as drawn."""
    return rounding_gain(filter, name, "t1") + rounding_gain(filter, name, "t2")


# --- what is drawn


@pytest.mark.parametrize(
    ("name", "a", "counts"),
    [("normal", poles_at(0.9, 0.3), Counts(9, 6, 2)), ("minimum-noise", poles_at(0.9, 0.3), Counts(9, 6, 2)),
     ("normal", [1.0, -0.9, 0.18], Counts(7, 4, 2)), ("normal", [1.0, -0.9], Counts(4, 2, 1)),
     ("minimum-noise", [1.0, -0.9], Counts(4, 2, 1))],
)
def test_counts(name: str, a: list[float], counts: Counts) -> None:
    """Of a general state space with two states 9, 6, 2 (Oppenheim & Schafer, ch. 6; Mitra; from memory)."""
    b = [0.5, 0.25, 0.125][: len(a)]
    assert build(section(b, a), form=name).diagram.counts() == counts
    program = realize(section(b, a), form=name, format=Fixed("Q1.15", coefficients={"bits": 24})).program
    assert len(program.roundings) == counts.delays + 1  # one a state, one of the output


@pytest.mark.parametrize("order", [3, 5])
def test_a_whole_filter_of_order_n_has_n_plus_1_squared_coefficients(order: int) -> None:
    filter = design("butterworth", rate=RATE, response="low-pass", order=order, frequency=2000)
    diagram = build(filter, form="minimum-noise", decomposition="whole").diagram
    assert diagram.counts() == Counts((order + 1) ** 2, order * (order + 1), order)
    general = diagram.hints.general
    assert general is not None and f"stand for {order} states" in general.caption
    text = svg(diagram)
    assert all(f"{value:.6e}".replace("-", "\N{MINUS SIGN}") in text or f"{value:.6f}".replace("-", "\N{MINUS SIGN}") in text
               for value in diagram.values[:, 0])


# --- the filter


@settings(max_examples=12)
@given(st.integers(1, 7), SEEDS)
def test_a_whole_filter_in_float64_agrees_with_scipy(order: int, seed: int) -> None:
    filter = random_filter(order, seed)
    diagram = build(filter, form="minimum-noise", decomposition="whole").diagram
    x = np.random.default_rng(seed).uniform(-1, 1, 60)
    (factor,) = filter.factors
    wanted = signal.sosfilt(signal.zpk2sos(factor.zeros, factor.poles, factor.gain), x)
    # scipy's own sections may grow what they round more than the state space does, at most by their own pole gains
    assert np.max(np.abs(in_float64(diagram, x) - wanted)) <= 100 * rounding_bound(diagram)


def test_order_12_at_20_hz_keeps_its_response() -> None:
    """Polynomials of it are hopeless in float64: their coefficients sum to 1e-29. The state space has its bits right."""
    filter = design("butterworth", rate=RATE, response="low-pass", order=12, frequency=20)
    space = build(filter, form="minimum-noise", decomposition="whole").diagram.state_space()
    solved = filter.zeros_poles()
    w = np.geomspace(2e-4, 3e-2, 40)
    _, wanted = signal.freqz_zpk(solved.zeros, solved.poles, solved.gain, worN=w)
    found = [(space.C @ np.linalg.solve(np.exp(1j * each) * np.eye(12) - space.A, space.B) + space.D)[0, 0] for each in w]
    # entries of 2^-53 relative, through poles 7e-4 from the circle
    np.testing.assert_allclose(found, wanted, rtol=0, atol=1e-12)


@pytest.mark.parametrize("which", ["peak of 0 dB", "pole that a zero cancels"])
def test_states_that_nothing_hears_stay_states(which: str) -> None:
    b, a = ([1.0, -1.5, 0.75], [1.0, -1.5, 0.75]) if which == "peak of 0 dB" else ([1.0, -0.5], [1.0, -1.25, 0.375])
    for name in BOTH:
        diagram = build(section(b, a), form=name).diagram
        x = np.random.default_rng(1).uniform(-1, 1, 50)
        np.testing.assert_allclose(in_float64(diagram, x), signal.lfilter(b, a, x), rtol=0, atol=rounding_bound(diagram))
        np.testing.assert_allclose(gramians(diagram)[0].diagonal(), 1.0, rtol=1e-9)


# --- scaling and noise


@pytest.mark.parametrize("name", BOTH)
@settings(max_examples=25)
@given(st.integers(1, 2), SEEDS)
def test_states_have_the_power_of_white_input(name: str, order: int, seed: int) -> None:
    diagram = build(random_filter(order, seed), form=name).diagram
    delays = [index for index, node in enumerate(diagram.nodes) if node.kind == "delay"]
    np.testing.assert_allclose(powers_from_input(diagram, nodes=delays), 1.0, rtol=1e-9)  # float64 norms


# Mullis & Roberts 1976, from memory; the closed form (1 + 4 Q^2) / 8 derived by fit and recomputed: least noise of the
# bilinear low-pass from 1 / (s^2 + s / Q + 1), and of direct-2 with its states scaled, K11 W11.
@pytest.mark.parametrize(("frequency", "direct_2"), [(8000, 0.4541), (1000, 8.754), (100, 743.1218)])
def test_least_noise_of_a_low_pass_does_not_depend_on_its_frequency(frequency: float, direct_2: float) -> None:
    filter = low_pass(frequency)
    assert states_noise(filter, "minimum-noise") == pytest.approx(3 / 8, rel=1e-8)
    assert states_noise(filter, "normal") == pytest.approx(1 / 2, rel=1e-8)
    k, w = gramians(build(filter, form="direct-2").diagram)
    assert k[0, 0] * w[0, 0] == pytest.approx(direct_2, rel=1e-4)  # as many digits are given, and scipy's are worse at 100 Hz
    for q in (0.5, 2.0, 8.0):
        assert states_noise(low_pass(frequency, q), "minimum-noise") == pytest.approx((1 + 4 * q * q) / 8, rel=1e-8)


def test_second_order_modes_of_a_low_pass() -> None:
    """(sqrt 3 + 1) / 4 and (sqrt 3 - 1) / 4 for Q = 1 / sqrt 2, at any frequency; Mullis & Roberts 1976 (from memory)."""
    for frequency in (8000, 1000, 300):
        for name in TWO_STATES:
            k, w = gramians(build(low_pass(frequency), form=name).diagram)
            modes = np.sort(np.sqrt(np.linalg.eigvals(k @ w).real))
            # scipy's solver loses digits as the poles near z = 1
            np.testing.assert_allclose(modes, [(math.sqrt(3) - 1) / 4, (math.sqrt(3) + 1) / 4], rtol=1e-6)


@settings(max_examples=15)
@given(SEEDS)
def test_modes_are_those_of_every_form_of_two_states(seed: int) -> None:
    # poles not so near each other that the form normal says so
    filter = Filter.from_zeros_poles([0.3, -0.6], [*complex_pair(seed)], 0.7, rate=RATE)
    found = [np.sort(np.linalg.eigvals(k @ w).real) for name in TWO_STATES
             for k, w in [gramians(build(filter, form=name).diagram)]]
    for each in found[1:]:
        np.testing.assert_allclose(each, found[0], rtol=1e-6, atol=1e-12)


def complex_pair(seed: int) -> tuple[complex, complex]:
    rng = np.random.default_rng(seed)
    pole = complex(rng.uniform(0.3, 0.97) * np.exp(1j * rng.uniform(0.1, 3.0)))
    return pole, pole.conjugate()


@settings(max_examples=20)
@given(st.integers(2, 4), SEEDS)
def test_no_state_space_of_the_same_scaling_is_quieter(order: int, seed: int) -> None:
    """Against random coordinates, each scaled to states of power 1; direct-2 and transposed-2 among them."""
    filter = random_filter(order, seed, 0.9)
    k, w = gramians(build(filter, form="minimum-noise", decomposition="whole").diagram)
    np.testing.assert_allclose(k.diagonal(), 1.0, rtol=1e-9)
    least = float(np.trace(w))
    assert least == pytest.approx(digits.least_noise(Ratio(*filter.ratio())), rel=2e-4)  # modes of 2^-16 and less are raised
    np.testing.assert_allclose(w.diagonal(), least / order, rtol=1e-3, atol=1e-12)  # each state's rounding is heard alike
    rng = np.random.default_rng(seed)
    others = [gramians(build(filter, form=name, decomposition="whole").diagram) for name in ("direct-2", "transposed-2")]
    for _ in range(20):
        into = rng.standard_normal((order, order))
        back = np.linalg.inv(into)
        others.append((back @ k @ back.T, into.T @ w @ into))
    for other_k, other_w in others:
        assert float(np.sum(other_k.diagonal() * other_w.diagonal())) >= least * (1 - 1e-6)


def test_predicted_noise_counts_the_states_and_the_output() -> None:
    """3/8 and 1/2 of a rounding of the states, and the output's own. Coefficients of 32 bits change it by 1e-4."""
    assert noise_gain(low_pass(1000), "minimum-noise") == pytest.approx(1.375, rel=1e-3)
    assert noise_gain(low_pass(1000), "normal") == pytest.approx(1.5, rel=1e-3)
    assert noise_gain(low_pass(1000), "minimum-noise", "whole") == pytest.approx(1.375, rel=1e-3)


def test_predicted_noise_is_measured_for_a_notch() -> None:
    filter = design("notch", rate=RATE, frequency=500, q=5)
    format = Fixed("Q1.15", coefficients={"bits": 32, "point": "coefficient"})
    measured = measure(realize(filter, form="normal", format=format), white(4 * RATE, 1, 1, -12.0), (20.0, 20000.0))
    assert measured.white.holds is True, measured.white.reason
    assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=max(0.5, measured.noise.interval_db))


# --- the normal matrix


@pytest.mark.parametrize("rounding", ["half-away", "floor", "half-up"])
@given(SEEDS)
@settings(max_examples=20)
def test_the_matrix_stays_normal_with_its_coefficients_rounded(rounding: str, seed: int) -> None:
    filter = Filter.from_zeros_poles([0.3, -0.6], [*complex_pair(seed)], 0.7, rate=RATE)
    format = Fixed("Q1.15", coefficients={"bits": 8, "rounding": rounding, "point": "polynomial"}, allow_vanishing=True)
    a = lower(build(filter, form="normal").diagram, format).diagram.state_space().A
    np.testing.assert_array_equal(a @ a.T, a.T @ a)  # coefficients of 8 bits: exact in float64


def test_an_overflow_dies_out_and_in_direct_1_it_does_not() -> None:
    """Barnes & Fam 1977: with a normal matrix of norm below 1, and registers rounded toward zero, every state decays.

    A wrap in direct-1 goes on with period 2 and amplitude 2 / (1 - a1 + a2), which for a1 = -1.6 and a2 = 0.8 is below 1
    (Ebert, Mazo & Taylor 1969, as quoted).
    """
    filter = section([0.5, 0.25, 0.125], [1.0, -1.6, 0.8])
    format = Fixed("Q1.15", coefficients={"bits": 16}, rounding="toward-zero", overflow="wrap")

    def left(name: str) -> list[float]:
        """The largest output long after noise at full scale has ended, for ten noises."""
        realization, found = realize(filter, form=name, format=format), []
        for seed in range(10):
            x = np.zeros(3000)
            x[: 100 + seed] = np.random.default_rng(seed).choice([-1.0, 1.0 - 2.0**-15], 100 + seed)
            realization.reset()
            found.append(float(np.abs(realization.process(x)[-500:]).max()))
            assert realization.tally().wraps > 0
        return found

    assert left("normal") == [0.0] * 10
    # coefficients and samples of 16 bits
    assert min(end for end in left("direct-1") if end) == pytest.approx(2 / 3.4, abs=1e-3)


def test_pole_sensitivity_is_1_where_that_of_direct_1_is_10() -> None:
    """dp/da1 and dp/da2 of poles 0.99 e^(+-j 0.05): J. Kaiser 1965/66, as quoted: 10.004168 and 10.10522."""
    filter = section([1.0, 0.5, 0.25], poles_at(0.99, 0.05))

    def moved(name: str, label: str) -> float:
        diagram, step = build(filter, form=name).diagram, 1e-6
        values = diagram.values.copy()
        values[[slot.label for slot in diagram.slots].index(label)] += step
        upper = [max(np.linalg.eigvals(each.state_space().A), key=lambda p: p.imag)
                 for each in (diagram, diagram.with_values(values))]
        return abs(upper[1] - upper[0]) / step

    # a step of 1e-6 bends the line by 1e-6 times 10^2 / 0.05 / 2 of itself
    assert moved("direct-1", "a1") == pytest.approx(10.004168, rel=2e-3)
    assert moved("direct-1", "a2") == pytest.approx(10.10522, rel=2e-3)
    assert moved("normal", "sigma") == pytest.approx(1.0, rel=1e-8)
    assert moved("normal", "omega") == pytest.approx(1.0, rel=1e-8)


# --- many digits


@given(st.lists(st.floats(0.001, 1.0), min_size=1, max_size=8))
def test_turns_make_a_diagonal_of_mean_1_all_ones(values: list[float]) -> None:
    import mpmath

    with mpmath.workprec(digits.BITS):
        shares = [mpmath.mpf(value) * len(values) / sum(map(mpmath.mpf, values)) for value in values]
        v = digits.equalizing(shares)
        turned, product = v * mpmath.diag(shares) * v.T, v * v.T
        tiny = mpmath.mpf(2) ** (40 - digits.BITS)
        assert all(abs(turned[i, i] - 1) < 2.0**-140 for i in range(v.rows))  # what is nearer to 1 is left alone
        assert all(abs(product[i, j] - (i == j)) < tiny for i in range(v.rows) for j in range(v.rows))


@settings(max_examples=10)
@given(st.integers(1, 8), SEEDS)
def test_the_lattices_coordinates_are_orthonormal(order: int, seed: int) -> None:
    """K = A K A' + B B' holds with K = I."""
    import mpmath

    ratio = Ratio(*random_filter(order, seed).ratio())
    with mpmath.workprec(digits.BITS):
        a, b, _ = digits.orthonormal(ratio)
        k = a * a.T + b * b.T
        assert all(abs(k[i, j] - (i == j)) < 2.0**-300 for i in range(order) for j in range(order))


@pytest.mark.parametrize("which", ["low-pass 20 Hz", "elliptic 5"])
def test_the_bits_do_not_depend_on_how_many_digits_are_carried(which: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """So they are the rounded true values, on every machine."""
    filter = low_pass(20) if which == "low-pass 20 Hz" else design(
        "elliptic", rate=RATE, response="low-pass", order=5, frequency=6000, ripple_db=0.5, stopband_db=50)
    ratio = Ratio(*filter.ratio())
    computed = [digits.quietest, modal.normal] if ratio.order == 2 else [digits.quietest]
    before = [compute.__wrapped__(ratio) for compute in computed]
    for module in (digits, modal):
        monkeypatch.setattr(module, "BITS", 560)
    assert [compute.__wrapped__(ratio) for compute in computed] == before


# --- refusals and hazards


@pytest.mark.parametrize("name", BOTH)
def test_a_longer_numerator_adds_poles_at_0(name: str) -> None:
    b, a = [0.5, 0.25, 0.125], [1.0, -0.75]
    diagram = build(section(b, a), form=name).diagram
    x = np.random.default_rng(1).uniform(-1, 1, 50)
    np.testing.assert_allclose(in_float64(diagram, x), signal.lfilter(b, a, x), rtol=0, atol=rounding_bound(diagram))


def test_large_states_are_said() -> None:
    """With its states scaled for white noise, the low-pass at 100 Hz makes of a constant what is computed here."""
    for name in BOTH:
        (said,) = build(low_pass(100), form=name).hazards
        space = build(low_pass(100), form=name).diagram.state_space()
        largest = np.abs(np.linalg.solve(np.eye(2) - space.A, space.B)).max()
        assert f"a full-scale constant into a section makes one of them {largest:.2g} times full scale" in said
        assert "4 more integer bits" in said and 8 < largest < 16
        assert build(low_pass(8000), form=name).hazards == ()
    (tone,) = build(low_pass(2000, 20.0), form="normal").hazards[:1]
    assert "a full-scale sine at 0.042 of the rate" in tone  # 2 kHz of 48


def test_poles_that_nearly_meet_are_said() -> None:
    """Residues of +-1 / (p - q) in two states: W grows with their square."""
    near = section([1.0, 0.5, 0.25], [1.0, -1.5, 0.5625 - 1e-8])
    assert any("the poles of a section nearly meet" in sentence for sentence in build(near, form="normal").hazards)
    assert not any("nearly meet" in sentence for sentence in build(near, form="minimum-noise").hazards)


@pytest.mark.parametrize("name", BOTH)
def test_the_explanations_counts_are_the_drawn_ones(name: str) -> None:
    assert "a second-order section 9, 6, 2" in form(name).docs.replace("\n", " ")


def test_kernels_give_what_the_definition_gives_for_seven_states() -> None:
    filter = design("butterworth", rate=RATE, response="low-pass", order=7, frequency=3000)
    realization = realize(filter, form="minimum-noise", decomposition="whole", format=Fixed("Q2.22", coefficients={"bits": 24}))
    x = np.random.default_rng(5).uniform(-1, 1, (300, 1))
    np.testing.assert_array_equal(realization.process(x), run_definition(realization.program, x)[:, 0])
