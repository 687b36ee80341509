"""How the gain is spread over sections, and the norms that l2 scaling rests on."""

import math
from fractions import Fraction

import numpy as np
import pytest
from band_pass import elliptic_band_pass
from form_filters import DIRECT, NUMERATOR_FIRST
from hypothesis import given
from hypothesis import strategies as st
from scipy import signal
from structure_evaluator import response, run, series

from streamhost.errors import StructureError
from streamhost.filters import Filter, Polynomials, design
from streamhost.structures import Built, build
from streamhost.structures.norm import l2_norm

RATE = 48000.0
RECURSION_FIRST = ("direct-1-swapped", "direct-2", "transposed-1")
RECURSIVE_NODE = {"direct-1-swapped": "w", "direct-2": "w", "transposed-1": "v"}
ONE = (Fraction(1),)


def exactly(values: list[float]) -> tuple[Fraction, ...]:
    return tuple(map(Fraction, values))


def in_24_bits(value: float) -> float:
    return float(np.float32(value))


# --- none


@given(st.integers(1, 12), st.sampled_from([0.75, -0.75, 1e-9, -3e5]))
def test_none_gives_every_section_the_same_share_and_the_first_the_sign(order: int, gain: float) -> None:
    monic = [0.25 * k / order for k in range(1, order + 1)]
    built = build(Filter.from_zeros_poles(monic, [-r for r in monic], gain, rate=RATE), form="direct-1")
    share = abs(gain) ** (1 / len(built.sections))
    others = [share] * (len(built.sections) - 1)
    assert [section.b[0] for section in built.sections] == [math.copysign(share, gain), *others]
    assert built.front is None and built.scaling == "none"


def test_none_multiplies_the_rounded_monic_numerators() -> None:
    """Two roots 0.1, 0.3 in float64: 1 - (r1 + r2) z^-1 + r1 r2 z^-2 exactly, rounded, times 0.7, rounded."""
    built = build(Filter.from_zeros_poles([0.1, 0.3], [0.5, 0.2], 0.7, rate=RATE), form="direct-1")
    first, second = Fraction(0.1), Fraction(0.3)
    assert built.sections[0].b == (0.7, 0.7 * float(-first - second), 0.7 * float(first * second))


# --- norms


@pytest.mark.parametrize(
    ("r", "theta", "printed"),
    [(0.9, 0.785398163, 5.7523), (0.99, 0.785398163, 50.7512), (0.99, 0.1, 2520.9973), (0.99, 0.130899694, 1480.9521)],
)
def test_the_norm_of_a_resonator_is_the_closed_form(r: float, theta: float, printed: float) -> None:
    """G = (1+a2)/(1-a2) / ((1+a2)^2 - a1^2): Jackson, BSTJ 49, 1970, and Oppenheim & Schafer, 6.9 (from memory)."""
    a = exactly([1.0, -2 * r * math.cos(theta), r * r])
    closed = (1 + a[2]) / (1 - a[2]) / ((1 + a[2]) ** 2 - a[1] ** 2)
    assert l2_norm(ONE, a) == in_24_bits(math.sqrt(closed))
    # Printed to 4 decimals; angles printed to 9 digits and squared norms in 24 bits cost up to a relative 4e-7.
    assert l2_norm(ONE, a) ** 2 == pytest.approx(printed, abs=5e-5, rel=4e-7)


@pytest.mark.parametrize(
    ("frequency", "inner", "power"),
    [(20, 4447.1167, 0.0009256), (100, 400.7185, 0.00462787), (1000, 13.7728, 0.04616473)],
)
def test_the_norms_of_a_low_pass_are_those_computed_three_ways(frequency: float, inner: float, power: float) -> None:
    """Cookbook low-pass, Q = 1/sqrt(2), 48 kHz: 1/A and H; own computation in three ways, independent of this code."""
    (section,) = design("low-pass", rate=RATE, frequency=frequency, q=1 / math.sqrt(2)).sections()
    b, a = exactly(section.b), exactly(section.a)
    # Half a unit of the last digit given, and 24 bits.
    assert abs(l2_norm(ONE, a) - inner) <= 5e-5 + inner * 2.0**-24
    assert abs(l2_norm(b, a) ** 2 - power) <= (5e-8 if frequency == 20 else 5e-9) + power * 2.0**-23


@pytest.mark.parametrize("a", [0.5, -0.9, 1 - 2.0**-20, 1 - 2.0**-40])
def test_the_norm_is_right_however_near_the_circle(a: float) -> None:
    """1 / (1 - a z^-1) has N^2 = 1 / (1 - a^2), exactly."""
    assert l2_norm(ONE, (Fraction(1), Fraction(-a))) == in_24_bits(math.sqrt(1 / (1 - Fraction(a) ** 2)))


def test_the_norm_of_clustered_poles_is_right() -> None:
    """(1 - a z^-1)^-2 has N^2 = (1 + a^2) / (1 - a^2)^3, from sum (n+1)^2 x^n."""
    a = Fraction(1 - 2.0**-24)
    power = (1 + a * a) / (1 - a * a) ** 3
    assert l2_norm(ONE, (Fraction(1), -2 * a, a * a)) == in_24_bits(math.sqrt(power))


def test_the_norm_of_a_finite_response_is_the_root_of_its_squares() -> None:
    b = [0.5, -0.25, 0.125, 1.0, 0.0, -0.75]
    assert l2_norm(exactly(b), ONE) == in_24_bits(math.sqrt(sum(v * v for v in b)))


@given(st.integers(1, 8), st.integers(0, 2**32 - 1))
def test_the_norm_is_that_of_the_impulse_response(order: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    pairs = int(rng.integers(0, order // 2 + 1))
    upper = rng.uniform(0, 0.8, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    a = np.poly([*upper, *upper.conj(), *rng.uniform(-0.8, 0.8, order - 2 * pairs)]).real.tolist()
    b = rng.uniform(-1, 1, int(rng.integers(1, order + 4))).tolist()
    # After 300 frames 0.8^n is 2^-96, which leaves room for the n^7 of eight equal poles. float64's roundings pass
    # through 1 / A, at worst 5^8 = 4e5 here: far below the 24 bits that are compared.
    h = signal.lfilter(b, a, np.eye(1, 300)[0])
    assert l2_norm(exactly(b), exactly(a)) == pytest.approx(math.sqrt(np.sum(h * h)), rel=2.0**-23)


# --- l2


def impulse_norms(built: Built, labels: list[str], frames: int) -> list[float]:
    values = run(built.diagram, [float(n == 0) for n in range(frames)], float)
    return [math.sqrt(sum(frame[label] ** 2 for frame in values)) for label in labels]


@pytest.mark.parametrize("name", NUMERATOR_FIRST)
def test_section_outputs_have_unit_norm_and_the_last_is_the_filters(name: str) -> None:
    built = build(elliptic_band_pass(), form=name, scaling="l2")
    *inner, last = impulse_norms(built, [f"y_{k}" for k in range(1, 7)], 4000)
    # Norms are kept in 24 bits, two of which meet in a section's factor: 2^-24 each.
    assert inner == pytest.approx([1.0] * 5, rel=2.0**-22)
    b, a = elliptic_band_pass().whole()
    assert last == pytest.approx(math.sqrt(np.sum(signal.lfilter(b, a, np.eye(1, 4000)[0]) ** 2)), rel=1e-6)
    assert built.front is None


@pytest.mark.parametrize("name", RECURSION_FIRST)
def test_recursive_nodes_have_unit_norm(name: str) -> None:
    built = build(elliptic_band_pass(), form=name, scaling="l2")
    node = RECURSIVE_NODE[name]
    found = impulse_norms(built, [f"{node}_{k}" for k in range(1, 7)], 4000)
    assert found == pytest.approx([1.0] * 6, rel=2.0**-22)
    front = built.diagram.slots[0]
    assert (front.label, front.section, front.part, front.feedback) == ("g", 0, "b", False)
    assert built.diagram.values[0, 0] == built.front
    assert len(built.diagram.slots) == 31


@pytest.mark.parametrize("name", DIRECT)
@pytest.mark.parametrize("decomposition", ["whole", "cascade"])
def test_scaling_leaves_the_filter_as_it_is(name: str, decomposition: str) -> None:
    """Stated scaling of a filter given as zeros and poles, as sections, and as polynomials."""
    by_roots = design("butterworth", rate=RATE, response="high-pass", order=5, frequency=3000)
    by_sections = Filter.from_sections(
        [[0.0, -0.5, 0.25, 1.0, -0.75, 0.5], [0.25, 0.5, 0.0, 1.0, -0.5, 0.0]], rate=RATE
    )
    by_coefficients = Filter.from_coefficients([0.5, 0.25, 0.125, 2.0], [1.0, -0.75, 0.5, -0.25], rate=RATE)
    for filter in (by_roots, by_sections, by_coefficients):
        built = build(filter, form=name, decomposition=decomposition, scaling="l2")
        b, a = filter.whole()
        found = np.array(response(built.diagram, 40, Fraction), dtype=float)
        wanted = np.array(series(b, a, 40), dtype=float)
        assert built.scaling == "l2"
        # Some ten coefficients, each a few roundings of 2^-53 off; the poles are nowhere within 0.1 of the circle.
        np.testing.assert_allclose(found, wanted, rtol=0, atol=1e-12)


@pytest.mark.parametrize("name", NUMERATOR_FIRST)
def test_one_section_without_a_point_keeps_its_bits(name: str) -> None:
    row = [0.1, 0.7, 0.3, 1.0, -0.5, 0.25]
    built = build(Filter.from_sections([row], rate=RATE), form=name, scaling="l2")
    assert built.sections == (Polynomials((0.1, 0.7, 0.3), (1.0, -0.5, 0.25)),)
    assert built.scaling == "l2"


def test_given_sections_are_scaled_in_their_pairs_and_order() -> None:
    """Of monic numerators, written out: N_1 of (1 - 0.5 z^-1) / (1 - 0.5 z^-1 + 0.25 z^-2), K = 4 x -0.5."""
    rows = [[4.0, -2.0, 0.0, 1.0, -0.5, 0.25], [-0.5, 0.25, 0.125, 1.0, -0.25, 0.0]]
    built = build(Filter.from_sections(rows, rate=RATE), form="direct-1", scaling="l2")
    n1 = l2_norm(exactly([1.0, -0.5]), exactly([1.0, -0.5, 0.25]))
    assert built.sections == (
        Polynomials((1 / n1, 1 / n1 * -0.5), (1.0, -0.5, 0.25)),
        Polynomials((-2 * n1, -2 * n1 * -0.5, -2 * n1 * -0.25), (1.0, -0.25)),
    )
    assert (built.pairing, built.ordering) == ("given", "given")


def test_the_recursive_nodes_factors_are_those_of_the_norms() -> None:
    rows = [[4.0, -2.0, 0.0, 1.0, -0.5, 0.25], [-0.5, 0.25, 0.125, 1.0, -0.25, 0.0]]
    built = build(Filter.from_sections(rows, rate=RATE), form="direct-2", scaling="l2")
    n1 = l2_norm(ONE, exactly([1.0, -0.5, 0.25]))
    n2 = l2_norm(exactly([1.0, -0.5]), exactly([1.0, -0.75, 0.375, -0.0625]))
    assert built.front == 1 / n1
    assert [section.b[0] for section in built.sections] == [n1 / n2, -2 * n2]


def test_norms_have_24_significant_bits() -> None:
    built = build(elliptic_band_pass(), form="direct-2", scaling="l2")
    assert built.front is not None
    first = design_norm(built.sections[0])
    assert built.front == 1 / in_24_bits(first)


def design_norm(section: Polynomials) -> float:
    """Of 1 / A by the closed form for a resonator."""
    _, a1, a2 = map(Fraction, section.a)
    return math.sqrt((1 + a2) / (1 - a2) / ((1 + a2) ** 2 - a1**2))




# --- refusals


@pytest.mark.parametrize("name", DIRECT)
def test_l2_refuses_a_norm_that_is_infinite(name: str) -> None:
    rows = [[1.0, 0.5, 0.0, 1.0, -1.0, 0.0], [1.0, 0.5, 0.0, 1.0, 0.5, 0.0]]
    with pytest.raises(StructureError, match=r'behind section 1 of 2.*Allowed for this filter is scaling "none"'):
        build(Filter.from_sections(rows, rate=RATE), form=name, scaling="l2")


def test_l2_does_not_mind_a_pole_that_no_norm_sees() -> None:
    """The last section's output is no scaled point where the numerator comes first."""
    rows = [[1.0, 0.5, 0.0, 1.0, 0.5, 0.0], [1.0, 0.5, 0.0, 1.0, -1.0, 0.0]]
    filter = Filter.from_sections(rows, rate=RATE)
    assert build(filter, form="direct-1", scaling="l2").scaling == "l2"
    with pytest.raises(StructureError, match="behind section 2 of 2"):
        build(filter, form="direct-2", scaling="l2")
