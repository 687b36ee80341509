"""Forms for poles near z = 1: delta, kingsbury, zoelzer. Their coefficients, their noise, what they do with a constant."""

from fractions import Fraction

import numpy as np
import pytest
from form_filters import coefficients, rounding_bound
from hypothesis import given, settings
from hypothesis import strategies as st
from low_noise_forms import RATE, by_definition, in_float64, low_pass, noise_gain, random_filter, section

from streamhost import Filter, Fixed, design, realize
from streamhost.diagram import Counts, Diagram
from streamhost.diagram.linear import exact_transfer_function
from streamhost.diagram.norms import norms_from_input
from streamhost.measure import measure
from streamhost.program.run import lower
from streamhost.signals import white
from streamhost.structures import build, form
from streamhost.structures.division import Ratio
from streamhost.structures.forms import delta, zoelzer

ALL = ("delta", "kingsbury", "zoelzer")
SEEDS = st.integers(0, 2**32 - 1)
SIXTEENTH = st.integers(-31, 31).map(lambda code: code / 16)


def shifts(diagram: Diagram) -> list[int]:
    return [node.k for node in diagram.nodes if node.kind == "shift"]


# --- what is drawn


@pytest.mark.parametrize(
    ("name", "second", "first", "roundings"),
    [("delta", Counts(5, 6, 2), Counts(3, 3, 1), 3), ("kingsbury", Counts(6, 6, 2), Counts(3, 3, 1), 4),
     ("zoelzer", Counts(7, 6, 2), Counts(3, 3, 1), 4)],
)
def test_counts_and_roundings(name: str, second: Counts, first: Counts, roundings: int) -> None:
    filter = low_pass(1000)
    assert build(filter, form=name).diagram.counts() == second
    stated = f"a second-order section {second.multiplications}, {second.additions}, {second.delays}"
    assert stated in form(name).docs.replace("\n", " ")
    assert build(section([0.25], [1.0, -0.75]), form=name).diagram.counts() == first
    format = Fixed("Q1.15", coefficients={"bits": 24})
    assert len(realize(filter, form=name, format=format).program.roundings) == roundings
    assert len(realize(section([0.25], [1.0, -0.75]), form=name, format=format).program.roundings) == 2


@given(st.integers(1, 12), SEEDS)
@settings(max_examples=15)
def test_delta_of_any_order_has_2n_plus_1_coefficients(order: int, seed: int) -> None:
    diagram = build(random_filter(order, seed), form="delta", decomposition="whole").diagram
    assert diagram.counts() == Counts(2 * order + 1, 3 * order, order)


def test_in_the_difference_x_minus_u_nothing_is_rounded() -> None:
    """It is a sum of stored values; its reader's operand is a bit longer."""
    program = realize(low_pass(100), form="zoelzer", format=Fixed("Q1.15", coefficients={"bits": 24})).program
    rounded = {program.nodes[program.nodes[index].source].label for index in program.roundings}
    assert rounded == {"u", "h", "v", "y"}


# --- the filter


@given(st.lists(SIXTEENTH, min_size=1, max_size=6), st.lists(SIXTEENTH, min_size=1, max_size=5))
@settings(max_examples=40)
def test_delta_is_the_filter_exactly(b: list[float], rest: list[float]) -> None:
    """Coefficients of few bits have an alpha and beta of few bits: nothing is rounded, stable or not."""
    filter = Filter.from_coefficients(b, [1.0, *rest], rate=RATE)
    ratio = Ratio(*filter.ratio())
    if not ratio.is_recursive:
        return
    found = exact_transfer_function(build(filter, form="delta", decomposition="whole").diagram)
    wanted = exact_transfer_function(build(filter, form="direct-1", decomposition="whole").diagram)
    assert found == wanted


@given(st.integers(1, 6), SEEDS)
@settings(max_examples=20)
def test_d_is_the_smallest_power_of_two_for_which_no_alpha_is_above_1(order: int, seed: int) -> None:
    ratio = Ratio(*random_filter(order, seed).ratio())
    k = delta.halvings(ratio)
    largest = [max(map(abs, delta.in_delta(ratio.a, ratio.order, each)[1:])) for each in (k, k + 1)]
    assert largest[1] > 1
    assert largest[0] <= 1 or k == 0


@pytest.mark.parametrize("frequency", [20, 100, 1000, 10000, 20000])
@pytest.mark.parametrize("q", [0.5, 0.707, 10.0])
def test_poles_are_those_of_the_published_denominators(frequency: float, q: float) -> None:
    """2 - k1 k2 - k1^2 and 1 - k1 k2 (Kingsbury 1972), 2 - z1 z2 - z1^3 and 1 - z1 z2 (Zölzer); from memory."""
    filter = low_pass(frequency, q)
    (given_as,) = filter.sections()
    k, z = (coefficients(build(filter, form=name).diagram) for name in ("kingsbury", "zoelzer"))
    # products of two rounded factors, subtracted from 2 and 1
    assert -given_as.a[1] == pytest.approx(2 - k["k1"] * k["k2"] - k["k1"] ** 2, abs=2.0**-50)
    assert given_as.a[2] == pytest.approx(1 - k["k1"] * k["k2"], abs=2.0**-50)
    assert -given_as.a[1] == pytest.approx(2 - z["z1"] * z["z2"] - z["z1"] ** 3, abs=2.0**-50)
    assert given_as.a[2] == pytest.approx(1 - z["z1"] * z["z2"], abs=2.0**-50)
    # and, relative: what is near z = 1 is near it by so much
    assert Fraction(k["k1"]) ** 2 == pytest.approx(sum(map(Fraction, given_as.a)), rel=2.0**-50)
    assert Fraction(z["z1"]) ** 3 == pytest.approx(sum(map(Fraction, given_as.a)), rel=2.0**-50)


@settings(max_examples=10)
@given(st.integers(1, 8), SEEDS)
def test_a_whole_filter_in_float64_agrees_with_scipy_in_delta(order: int, seed: int) -> None:
    built = build(random_filter(order, seed, 0.8), form="delta", decomposition="whole")
    x = np.random.default_rng(seed).uniform(-1, 1, 60)
    wanted = by_definition(built.sections, x)
    # scipy's polynomials are rounded where delta's are not: direct-1 stands for what that makes
    direct = rounding_bound(build(random_filter(order, seed, 0.8), form="direct-1", decomposition="whole").diagram)
    assert np.max(np.abs(in_float64(built.diagram, x) - wanted)) <= rounding_bound(built.diagram) + direct


@pytest.mark.parametrize("name", ALL)
def test_a_longer_numerator_adds_a_pole_at_0(name: str) -> None:
    b, a = [0.5, 0.25, 0.125], [1.0, -0.75]
    found = exact_transfer_function(build(section(b, a), form=name).diagram)
    if name == "delta":
        assert found.numerators[0][0] == tuple(map(Fraction, b)) and found.denominator == tuple(map(Fraction, a))
    x = np.random.default_rng(1).uniform(-1, 1, 50)
    diagram = build(section(b, a), form=name).diagram
    np.testing.assert_allclose(in_float64(diagram, x), by_definition(build(section(b, a), form=name).sections, x), rtol=0,
                               atol=rounding_bound(diagram))


# --- noise and size


def growth_db(name: str) -> float:
    """How much louder the roundings are heard at 50 Hz than at 100 Hz."""
    return 10.0 * np.log10(noise_gain(low_pass(50), name) / noise_gain(low_pass(100), name))


def test_noise_grows_by_3_db_an_octave_downwards_and_not_by_9() -> None:
    """1 / A has the power 1 / (4 zeta theta^3) for a small angle theta; a summing register's rounding has theta^2 of it."""
    assert growth_db("direct-1") == pytest.approx(9.03, abs=0.1)
    assert growth_db("delta") == pytest.approx(3.01, abs=0.15)
    assert growth_db("kingsbury") == pytest.approx(3.01, abs=0.15)
    # here v's scale follows theta^(1/3) in whole octaves: up to 2 dB of the part that it has
    assert growth_db("zoelzer") == pytest.approx(3.01, abs=1.0)
    assert noise_gain(low_pass(100), "kingsbury") < noise_gain(low_pass(100), "direct-1") * 10**-3.1
    assert noise_gain(low_pass(100), "zoelzer") < noise_gain(low_pass(100), "direct-1") * 10**-3.1
    assert noise_gain(low_pass(100), "delta") < noise_gain(low_pass(100), "transposed-2") * 10**-3.3


@pytest.mark.parametrize("name", ["kingsbury", "zoelzer"])
@pytest.mark.parametrize("q", [0.5, 0.707, 4.0])
@pytest.mark.parametrize("frequency", [20, 37, 90, 200, 450, 1000])
def test_registers_need_no_integer_bits_for_the_recursion(name: str, q: float, frequency: float) -> None:
    """u is the low-passed input, at most 1 or 1.03 Q of a sine; v is Q times it, in zoelzer within a root of 2."""
    diagram = build(low_pass(frequency, q), form=name).diagram
    place = {node.label: index for index, node in enumerate(diagram.nodes)}
    u, v = norms_from_input(diagram, nodes=[place["du"], place["dv"]]).peak
    assert u <= max(1.0, 1.04 * q) * 1.01
    low, high = (1.0, 1.0) if name == "kingsbury" else (2**-0.5, 2**0.5)
    # sqrt(1 + a1 + a2) leaves theta by its square
    assert low * 0.93 * q <= v <= high * 1.08 * q


def test_the_shifts_of_zoelzer_are_by_the_root_of_z1() -> None:
    for frequency in (20, 100, 1000, 15000):
        ratio = Ratio(*low_pass(frequency).ratio())
        m = zoelzer.doublings(ratio)
        z1 = float(sum(ratio.a)) ** (1 / 3)
        assert m == max(0, round(-np.log2(z1) / 2))
        assert shifts(build(low_pass(frequency), form="zoelzer").diagram) == ([-m, m] if m else [])


def test_a_constant_rests_where_no_coefficient_moves_it() -> None:
    """u = x and v = 0 for any filter: exchanged coefficients of equal gain at 0 Hz disturb no constant signal.

    In direct-2 the state of a constant 1 is 1 / A(1): 63.8386 for this low-pass (own computation).
    """
    for name in ("kingsbury", "zoelzer"):
        for filter in (low_pass(1000), low_pass(100, 3.0), design("notch", rate=RATE, frequency=300, q=2)):
            space = build(filter, form=name).diagram.state_space()
            rest = np.linalg.solve(np.eye(2) - space.A, space.B)[:, 0]
            np.testing.assert_allclose(rest, [0.0, 1.0], rtol=0, atol=1e-9)  # dv, du; 2^-52 over 1 - |p| = 5e-3
            assert space.C[0] @ rest + space.D[0, 0] == pytest.approx(1.0, abs=1e-9)
    space = build(low_pass(1000), form="direct-2").diagram.state_space()
    np.testing.assert_allclose(np.linalg.solve(np.eye(2) - space.A, space.B)[:, 0], 63.8386, rtol=1e-6)


def stored_poles(filter: Filter, name: str, coefficients: object) -> np.ndarray:
    program = lower(build(filter, form=name).diagram, Fixed("Q1.15", coefficients=coefficients, allow_vanishing=True))
    return np.linalg.eigvals(program.diagram.state_space().A)


def test_16_bit_coefficients_place_poles_at_20_hz() -> None:
    """In Q2.14 direct-1's become -32707 and 16323, a pole at z = 1; at 100 Hz they ring at 46.63 Hz (own computation).

    That is the angle of the poles; the low-pass's own poles have its frequency divided by root 2.
    """
    def frequency(poles: np.ndarray) -> float:
        return float(np.abs(np.angle(poles)).max() * RATE / (2 * np.pi))

    at_20 = lower(build(low_pass(20), form="direct-1").diagram, Fixed("Q1.15", coefficients="Q2.14", allow_vanishing=True))
    assert at_20.stored is not None and [codes[0] for codes in at_20.stored.codes][1::2] == [16323, -32707]
    assert np.abs(stored_poles(low_pass(20), "direct-1", "Q2.14") - 1).min() < 1e-9
    assert frequency(stored_poles(low_pass(100), "direct-1", "Q2.14")) == pytest.approx(46.63, abs=0.01)
    for wanted in (20, 100):
        for name in ALL:
            found = frequency(stored_poles(low_pass(wanted), name, {"bits": 16, "point": "coefficient"}))
            # 16 significant bits of each coefficient: 2^-16 of k1, three times that of z1^3, alpha1 and alpha2 cancel in half
            assert found == pytest.approx(wanted / 2**0.5, rel=2e-4), name


# --- hazards


def test_poles_on_the_circle_are_carried_where_the_coefficients_exist() -> None:
    oscillator = section([0.0, 1.0], [1.0, -1.0, 1.0])
    for name in ALL:
        assert exact_transfer_function(build(oscillator, form=name).diagram).denominator == (1, -1, 1)
    integrator = build(section([1.0], [1.0, -1.0]), form="delta").diagram
    assert exact_transfer_function(integrator).denominator == (1, -1) and shifts(integrator) == []


def test_poles_far_from_1_are_said() -> None:
    high = low_pass(20000, 2.0)
    assert "it gains nothing over transposed-2" in build(high, form="delta").hazards[0]
    for name in ("kingsbury", "zoelzer"):
        assert "nearer to z = -1 than to z = 1" in build(high, form=name).hazards[0]
    for name in ALL:
        assert build(low_pass(1000), form=name).hazards == ()


def test_a_long_delta_is_one_row_with_its_own_shift() -> None:
    filter = design("butterworth", rate=RATE, response="low-pass", order=6, frequency=500)
    diagram = build(filter, form="delta", decomposition="whole").diagram
    general = diagram.hints.general
    assert general is not None and "k = 1 to 5; N = 6." in general.caption
    assert set(shifts(general.diagram)) == set(shifts(diagram)) != set()


# --- measured


def test_predicted_noise_is_measured() -> None:
    format = Fixed("Q1.23", coefficients={"bits": 32, "point": "coefficient"})
    realization = realize(low_pass(100), form="zoelzer", format=format)
    measured = measure(realization, white(4 * RATE, 1, 1, -10.0), (20.0, 20000.0))
    assert measured.white.holds is True, measured.white.reason
    assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=max(0.5, measured.noise.interval_db))
