"""How a filter becomes sections: kept as given, paired, ordered; and what is refused."""

from fractions import Fraction
from itertools import pairwise

import numpy as np
import pytest
from band_pass import elliptic_band_pass
from hypothesis import assume, given
from hypothesis import strategies as st
from scipy import signal
from structure_evaluator import response

from streamhost.errors import StructureError
from streamhost.filters import Filter, Polynomials, design
from streamhost.structures import Built, build, decompositions

RATE = 48000.0
ROWS = [
    [0.5, 0.25, 0.125, 1.0, -1.75, 0.875],
    [1.0, -0.5, 0.0, 1.0, 0.25, 0.0],
    [-2.0, 0.0, 1.0, 1.0, -0.5, 0.5],
]
AS_GIVEN = (
    Polynomials((0.5, 0.25, 0.125), (1.0, -1.75, 0.875)),
    Polynomials((1.0, -0.5), (1.0, 0.25)),
    Polynomials((-2.0, 0.0, 1.0), (1.0, -0.5, 0.5)),
)


def cascade(filter: Filter, **choices: str) -> Built:
    return build(filter, form="direct-1", decomposition="cascade", **choices)


def rows_of(built: Built) -> np.ndarray:
    """The sections as a table of second-order rows with monic numerators."""
    table = []
    for section in built.sections:
        b, a = ([*values, *[0.0] * (3 - len(values))] for values in (section.b, section.a))
        table.append([*(value / b[0] for value in b), *a])
    return np.array(table)


def radius(section: Polynomials) -> float:
    """Of the pole nearest the unit circle, from a section that is stable."""
    return max(abs(np.roots(section.a)), default=0.0)


# --- sections kept as given


@pytest.mark.parametrize(
    "choices",
    [{}, {"pairing": "given"}, {"ordering": "given"}, {"scaling": "none"}, {"pairing": "given", "scaling": "none"}],
)
def test_given_sections_stay_as_they_are(choices: dict[str, str]) -> None:
    built = cascade(Filter.from_sections(ROWS, rate=RATE), **choices)
    assert built.sections == AS_GIVEN
    assert (built.pairing, built.ordering, built.scaling) == ("given", "given", "none")


def test_a_stated_ordering_moves_given_sections_and_changes_no_bit() -> None:
    """Their poles have the radii sqrt(0.875) = 0.935, 0.25 and sqrt(0.5) = 0.707."""
    filter = Filter.from_sections(ROWS, rate=RATE)
    first, second, third = AS_GIVEN
    outward, inward = cascade(filter, ordering="outward"), cascade(filter, ordering="inward")
    assert outward.sections == (second, third, first)
    assert inward.sections == (first, third, second)
    assert (outward.pairing, outward.ordering, outward.scaling) == ("given", "outward", "none")


def test_sections_equally_far_from_the_circle_keep_their_order() -> None:
    rows = [[1.0, 0.5, 0.0, 1.0, -0.5, 0.0], [1.0, 0.25, 0.0, 1.0, 0.5, 0.0]]
    for ordering in ("outward", "inward"):
        built = cascade(Filter.from_sections(rows, rate=RATE), ordering=ordering)
        assert [section.b[1] for section in built.sections] == [0.5, 0.25]


@pytest.mark.parametrize(("outside", "sections"), [(1.25, [-0.5, -1.25]), (1.75, [-1.75, -0.5])])
def test_a_section_outside_the_circle_is_as_far_as_its_distance(outside: float, sections: list[float]) -> None:
    """0.25 and 0.75 from the circle, beside a section at 0.5 from it."""
    rows = [[1.0, 0.0, 0.0, 1.0, -outside, 0.0], [1.0, 0.0, 0.0, 1.0, -0.5, 0.0]]
    built = cascade(Filter.from_sections(rows, rate=RATE), ordering="outward")
    assert [section.a[1] for section in built.sections] == sections


def test_a_section_without_poles_is_farthest_from_the_circle() -> None:
    rows = [[1.0, 0.0, 0.0, 1.0, -0.5, 0.0], [1.0, 0.5, 0.25, 1.0, 0.0, 0.0]]
    built = cascade(Filter.from_sections(rows, rate=RATE), ordering="outward")
    assert [section.a for section in built.sections] == [(1.0,), (1.0, -0.5)]


def test_a_stated_pairing_takes_given_sections_apart() -> None:
    """Two sections of first order, zeros the wrong way round: their real poles go into one section of second order."""
    rows = [[2.0, -0.5, 0.0, 1.0, -0.875, 0.0], [1.0, -0.75, 0.0, 1.0, -0.25, 0.0]]
    built = cascade(Filter.from_sections(rows, rate=RATE), pairing="nearest")
    assert (built.pairing, built.ordering, built.scaling) == ("nearest", "outward", "none")
    # 2 (1 - 0.25 z^-1) (1 - 0.75 z^-1) over (1 - 0.875 z^-1) (1 - 0.25 z^-1): all dyadic, and S = 1.
    assert built.sections == (Polynomials((2.0, -2.0, 0.375), (1.0, -1.125, 0.21875)),)


def test_a_second_order_filter_given_as_polynomials_is_a_section() -> None:
    built = cascade(Filter.from_coefficients([0.3, 0.2, 0.1], [2.0, 0.5, 0.25], rate=RATE))
    assert built.pairing == "given"
    assert built.sections[0].b == (0.15, 0.1, 0.05)


# --- codes


CODES = [[4096, -100, 0, 4096, -7807, 3733], [1, 2, 3, 4096, 0, 17]]


def test_codes_are_drawn_as_the_cascade_that_they_are() -> None:
    for choices in ({}, {"pairing": "given", "ordering": "given", "scaling": "none"}):
        built = cascade(Filter.from_codes(CODES, "Q4.12", rate=RATE), **choices)
        assert (built.pairing, built.ordering, built.scaling) == ("given", "given", "none")
        assert built.sections[0] == Polynomials((1.0, -100 / 4096), (1.0, -7807 / 4096, 3733 / 4096))
        assert built.sections[1] == Polynomials((1 / 4096, 2 / 4096, 3 / 4096), (1.0, 0.0, 17 / 4096))


@pytest.mark.parametrize(
    ("choices", "allowed"),
    [
        ({"pairing": "nearest"}, "given"), ({"ordering": "outward"}, "given"), ({"ordering": "inward"}, "given"),
        ({"scaling": "l2"}, "none"), ({"decomposition": "whole"}, "cascade"),
    ],
)
def test_codes_refuse_what_would_change_them(choices: dict[str, str], allowed: str) -> None:
    with pytest.raises(StructureError, match=f'codes of Q4.12.*Allowed for it is "{allowed}"'):
        build(Filter.from_codes(CODES, "Q4.12", rate=RATE), form="direct-1", **choices)


# --- pairing and ordering against scipy's zpk2sos as an independent implementation of the same rule


def families(order: int, kind: str, band: str, edge: float) -> tuple[np.ndarray, np.ndarray, float]:
    edges = [edge, edge * 1.5] if band == "bandpass" else edge
    if kind == "ellip":
        return signal.ellip(order, 0.5, 50, edges, band, output="zpk")
    if kind == "cheby1":
        return signal.cheby1(order, 0.5, edges, band, output="zpk")
    if kind == "cheby2":
        return signal.cheby2(order, 40, edges, band, output="zpk")
    return signal.butter(order, edges, band, output="zpk")


def paired_exactly(z: np.ndarray, p: np.ndarray, k: float) -> tuple[list[complex], list[complex], float]:
    """The upper half plane and its mirror image, so that nobody's tolerance matters."""
    both = []
    for roots in (z, p):
        upper = [complex(root) for root in roots if root.imag > 1e-12]
        real = [float(root.real) for root in roots if abs(root.imag) <= 1e-12]
        both.append([*upper, *(root.conjugate() for root in upper), *real])
    return both[0], both[1], float(k)


def clear(values: list[float]) -> bool:
    """Whether no two differ by so little that the choice between them is one of rounding."""
    return all(b - a > 1e-9 or b == a for a, b in pairwise(sorted(values)))


def unambiguous(z: list[complex], p: list[complex]) -> bool:
    uppers = [root for root in p if complex(root).imag >= 0]
    zeros = [root for root in z if complex(root).imag >= 0]
    radii = clear([abs(1 - abs(root)) for root in uppers])
    return radii and all(clear([abs(zero - pole) for zero in set(zeros)]) for pole in uppers)


@given(
    st.integers(1, 9), st.sampled_from(["ellip", "cheby1", "cheby2", "butter"]),
    st.sampled_from(["lowpass", "highpass", "bandpass"]), st.integers(20, 600).map(lambda n: n / 1000),
)
def test_pairing_and_ordering_agree_with_zpk2sos(order: int, kind: str, band: str, edge: float) -> None:
    z, p, k = paired_exactly(*families(order, kind, band, edge))
    assume(len(p) % 2 == 0)  # of an odd order ours leaves a real pole alone, which zpk2sos joins with a root at 0
    assume(unambiguous(z, p))
    built = cascade(Filter.from_zeros_poles(z, p, k, rate=RATE))
    wanted = signal.zpk2sos(z, p, k, pairing="nearest")
    wanted[0, :3] /= k
    # Coefficients are at most 2 and a few roundings of 2^-53 each on both sides; the pairing is right or far off.
    np.testing.assert_allclose(rows_of(built), wanted, rtol=0, atol=1e-14)


@given(st.integers(0, 2**32 - 1), st.integers(0, 5), st.integers(0, 5), st.integers(0, 3), st.integers(0, 3))
def test_pairing_agrees_with_zpk2sos_on_any_roots(
    seed: int, zero_pairs: int, pole_pairs: int, real_zeros: int, real_poles: int
) -> None:
    """Real roots, more poles or more zeros: filled up at z = 0 on both sides."""
    rng = np.random.default_rng(seed)
    z, p = roots(rng, zero_pairs, real_zeros), roots(rng, pole_pairs, real_poles)
    count = max(len(z), len(p))
    assume(count > 0 and count % 2 == 0)
    z, p = [*z, *[0.0] * (count - len(z))], [*p, *[0.0] * (count - len(p))]
    built = cascade(Filter.from_zeros_poles(z, p, 1.0, rate=RATE))
    np.testing.assert_allclose(rows_of(built), signal.zpk2sos(z, p, 1.0, pairing="nearest"), rtol=0, atol=1e-14)


def roots(rng: np.random.Generator, pairs: int, real: int) -> list[complex]:
    upper = rng.uniform(0.1, 0.99, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    return [*upper.tolist(), *upper.conj().tolist(), *rng.uniform(-0.99, 0.99, real).tolist()]


def test_poles_outside_the_circle_pair_by_their_distance_too() -> None:
    """0.4 and 0.3 from the circle on its two sides: the nearer takes the zeros beside it, as zpk2sos has it."""
    z, p = [1.4j, -1.4j, 0.6j, -0.6j], [1.4j + 0.01, 0.01 - 1.4j, 0.7j, -0.7j]
    built = cascade(Filter.from_zeros_poles(z, p, 1.0, rate=RATE))
    np.testing.assert_allclose(rows_of(built), signal.zpk2sos(z, p, 1.0, pairing="nearest"), rtol=0, atol=1e-14)


def test_of_poles_equally_far_complex_ones_come_first_and_then_the_left() -> None:
    """Chosen first means drawn last under `outward`."""
    p = [0.5j, -0.5j, 0.5, -0.5]
    built = cascade(Filter.from_zeros_poles([0.0] * 4, p, 1.0, rate=RATE))
    assert [section.a for section in built.sections] == [(1.0, 0.0, -0.25), (1.0, 0.0, 0.25)]
    mirrored = [0.25 + 0.5j, 0.25 - 0.5j, -0.25 + 0.5j, -0.25 - 0.5j]
    built = cascade(Filter.from_zeros_poles([0.0] * 4, mirrored, 1.0, rate=RATE))
    assert [section.a[1] for section in built.sections] == [-0.5, 0.5]


@given(st.integers(1, 12), st.floats(200, 10000))
def test_outward_ends_at_the_circle_and_inward_is_its_reverse(order: int, frequency: float) -> None:
    filter = design(
        "elliptic", rate=RATE, response="low-pass", order=order, frequency=frequency, ripple_db=1, stopband_db=60
    )
    outward, inward = cascade(filter), cascade(filter, ordering="inward")
    radii = [radius(section) for section in outward.sections]
    assert radii == sorted(radii)
    assert [section.a for section in inward.sections] == [section.a for section in reversed(outward.sections)]


@given(st.integers(1, 64).filter(lambda n: n % 7 in (1, 2)), st.sampled_from(["low-pass", "high-pass"]))
def test_section_coefficients_are_the_roots_coefficients_rounded_once(order: int, kind: str) -> None:
    filter = design("butterworth", rate=RATE, response=kind, order=order, frequency=300)
    expected = {
        (1.0, float(-2 * Fraction(p.real)), float(Fraction(p.real) ** 2 + Fraction(p.imag) ** 2))
        for p in filter.zeros_poles().poles
        if p.imag > 0
    } | {(1.0, -p.real) for p in filter.zeros_poles().poles if p.imag == 0}
    assert {section.a for section in cascade(filter).sections} == expected


# --- shapes


@pytest.mark.parametrize("order", [1, 3, 5, 7])
@pytest.mark.parametrize("kind", ["low-pass", "high-pass"])
@pytest.mark.parametrize("family", ["butterworth", "elliptic"])
def test_an_odd_order_has_one_first_order_section(order: int, kind: str, family: str) -> None:
    """A real pole with a real zero, and second-order sections besides (common practice)."""
    ripple = {"ripple_db": 0.5, "stopband_db": 50} if family == "elliptic" else {}
    filter = design(family, rate=RATE, response=kind, order=order, frequency=1000, **ripple)
    shapes = [(len(s.b), len(s.a)) for s in cascade(filter).sections]
    assert sorted(shapes) == [(2, 2)] + [(3, 3)] * (order // 2)


@given(st.integers(0, 2**32 - 1), st.integers(0, 4), st.integers(0, 4), st.integers(0, 2), st.integers(0, 2))
def test_an_odd_number_of_roots_keeps_the_response(
    seed: int, zero_pairs: int, pole_pairs: int, real_zeros: int, real_poles: int
) -> None:
    rng = np.random.default_rng(seed)
    z, p = roots(rng, zero_pairs, 2 * real_zeros + 1), roots(rng, pole_pairs, 2 * real_poles + 1)
    assume(len(z) <= len(p))
    filter = Filter.from_zeros_poles(z, p, 1.0, rate=RATE)
    sections = cascade(filter).sections
    assert sum(len(section.a) == 2 for section in sections) == 1
    rows = np.array([[*s.b, *[0.0] * (3 - len(s.b)), *s.a, *[0.0] * (3 - len(s.a))] for s in sections])
    w = np.linspace(0.1, 3.0, 16)
    wanted = signal.freqz_zpk(z, p, 1.0, worN=w)[1]
    # A few dozen roundings of coefficients next to poles of radius up to 0.99.
    np.testing.assert_allclose(signal.freqz_sos(rows, worN=w)[1], wanted, rtol=1e-9)


def test_a_delay_becomes_leading_zeros_in_the_sections_paired_last() -> None:
    """Three poles pairs and one zero pair, so that z^-4 is left: the pair on the circle's side keeps the zeros."""
    poles = [0.9j, 0.5 + 0.5j, 0.25j]
    poles = [*poles, *(pole.conjugate() for pole in poles)]
    filter = Filter.from_zeros_poles([0.75j, -0.75j], poles, 1.0, rate=RATE)
    built = cascade(filter)
    assert [section.b[:2] for section in built.sections] == [(0.0, 0.0), (0.0, 0.0), (1.0, 0.0)]
    found = [float(value) for value in response(built.diagram, 24, Fraction)]
    assert found[:4] == [0.0] * 4
    # The response of the roots themselves, as scipy expands them; a few roundings of values of about 1.
    b, a = signal.zpk2tf([0.75j, -0.75j], poles, 1.0)
    wanted = signal.lfilter([0.0] * (7 - len(b)) + list(np.atleast_1d(b)), a, np.eye(1, 24)[0])
    np.testing.assert_allclose(found, wanted, rtol=0, atol=1e-13)


def test_a_constant_and_a_pure_delay_can_be_divided() -> None:
    constant = cascade(Filter.from_zeros_poles([], [], -0.5, rate=RATE))
    assert constant.sections == (Polynomials((-0.5,), (1.0,)),)
    late = cascade(Filter.from_zeros_poles([], [0.0, 0.0, 0.0], 0.5, rate=RATE))
    assert [float(v) for v in response(late.diagram, 5, Fraction)] == pytest.approx([0, 0, 0, 0.5, 0], abs=2.0**-53)


def test_a_finite_response_given_as_polynomials_can_be_divided() -> None:
    b = [1.0, 0.5, -0.25, 0.125, 0.75, 0.5]
    built = cascade(Filter.from_coefficients(b, rate=RATE))
    assert all(section.a == (1.0,) for section in built.sections)
    # Roots and three sections' coefficients are rounded: some ten relative errors of 2^-53 on values up to about 1.
    np.testing.assert_allclose([float(v) for v in response(built.diagram, 8, Fraction)], [*b, 0, 0], rtol=0, atol=1e-14)


def test_poles_and_zeros_on_the_circle_can_be_divided() -> None:
    built = cascade(Filter.from_zeros_poles([1.0, -1.0, 1j, -1j], [1.0, 0.5, -1j, 1j], 1.0, rate=RATE))
    assert {section.a for section in built.sections} == {(1.0, 0.0, 1.0), (1.0, -1.5, 0.5)}


def test_order_64_can_be_divided_and_drawn() -> None:
    filter = design("butterworth", rate=RATE, response="low-pass", order=64, frequency=1000)
    built = cascade(filter)
    assert len(built.sections) == 32 and built.diagram.counts().delays == 128
    hertz = np.array([20.0, 500.0, 1000.0])
    rows = [[*(s.b + (0.0, 0.0))[:3], *s.a] for s in built.sections]
    # Sections' coefficients are rounded to 2^-53; the poles lie 0.003 from the circle, 32 sections multiply.
    np.testing.assert_allclose(
        Filter.from_sections(rows, rate=RATE).response(hertz), filter.response(hertz), rtol=1e-9
    )
    assert build(filter, form="transposed-2", decomposition="whole").diagram.counts().delays == 64


def test_a_filter_of_zero_gain_stays_zero() -> None:
    filter = Filter.from_coefficients([0.0], [1.0, 0.5, 0.25, 0.125], rate=RATE)
    for scaling in ("none", "l2"):
        built = cascade(filter, scaling=scaling)
        assert response(built.diagram, 6, Fraction) == [0] * 6




# --- refusals and hazards


@pytest.mark.parametrize(
    ("choices", "message"),
    [
        ({"decomposition": "cascades"}, 'no decomposition \'cascades\'. Did you mean "cascade"'),
        ({"pairing": "neares"}, 'no pairing \'neares\'. Did you mean "nearest".*Allowed are nearest, given'),
        ({"ordering": "upward"}, 'no ordering \'upward\'. Did you mean "outward"'),
        ({"scaling": "L2"}, "no scaling 'L2'.*Allowed are none, l1, l2"),
        ({"pairing": "given"}, 'of order 12, was not given as sections.*Allowed for it is "nearest"'),
        ({"ordering": "given"}, 'Allowed with it are "outward", "inward" and "quietest"'),
    ],
)
def test_wrong_choices_are_refused(choices: dict[str, str], message: str) -> None:
    with pytest.raises(StructureError, match=message):
        build(elliptic_band_pass(), form="direct-1", **choices)


def test_a_long_polynomial_is_not_solved() -> None:
    filter = Filter.from_coefficients([1.0] * 400, rate=RATE)
    with pytest.raises(StructureError, match=r'order 399; up to 128.*decomposition "whole"'):
        cascade(filter)
    assert build(filter, form="transposed-2", decomposition="whole").diagram.counts().delays == 399


def test_the_decompositions_are_these() -> None:
    assert decompositions() == ("whole", "cascade", "parallel")


def test_an_undivided_high_order_near_the_circle_is_a_hazard_and_a_cascade_is_none() -> None:
    whole = build(elliptic_band_pass(), form="direct-2", decomposition="whole")
    assert len(whole.hazards) == 1 and "order 12" in whole.hazards[0]
    assert cascade(elliptic_band_pass()).hazards == ()


@pytest.mark.parametrize("near", [0.989, 0.991])
def test_the_same_poles_are_near_however_they_are_given(near: float) -> None:
    p = [near, 0.5, -0.5, 0.25, -0.25]
    by_roots = Filter.from_zeros_poles([], p, 1.0, rate=RATE)
    by_coefficients = Filter.from_coefficients([1.0], np.poly(p).tolist(), rate=RATE)
    for filter in (by_roots, by_coefficients):
        assert bool(build(filter, form="direct-1", decomposition="whole").hazards) == (near > 0.99)


def test_what_float64_makes_unstable_is_said() -> None:
    """Eighth order at 20 Hz: expanded and rounded, poles leave the unit circle; the cascade keeps them."""
    filter = design("butterworth", rate=RATE, response="low-pass", order=8, frequency=20)
    hazards = build(filter, form="direct-2", decomposition="whole").hazards
    assert any("rounded to float64" in sentence for sentence in hazards)
    assert cascade(filter).hazards == ()
