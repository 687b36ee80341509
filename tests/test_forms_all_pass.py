"""The forms that are half the sum of two all-passes: the division of the poles, the sections, and what fixed point does."""

from fractions import Fraction

import numpy as np
import pytest
from form_filters import rounding_bound
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import signal

from streamhost import Filter, Fixed, design, realize
from streamhost.diagram import Counts, Diagram
from streamhost.diagram.fan import impulse_response
from streamhost.diagram.nodes import Delay, Sum
from streamhost.diagram.norms import norms_from_input
from streamhost.errors import StructureError
from streamhost.filters.exact import product
from streamhost.formats import named_format
from streamhost.measure import measure
from streamhost.program.native.kernel import Variant, compile_kernel, no_marks, no_trace
from streamhost.program.run import lower, run_definition
from streamhost.program.sources import traced_roundings
from streamhost.signals import white
from streamhost.structures import build, form
from streamhost.structures.all_pass import Halves, halves
from streamhost.structures.division import Ratio
from streamhost.structures.forms.wave_digital import scale

RATE = 48000
FORMS = ("all-pass-sum", "wave-digital")
FRAMES = 300


def butterworth(order: int, frequency: object = 1000.0, response: str = "low-pass") -> Filter:
    return design("butterworth", rate=RATE, response=response, order=order, frequency=frequency)


def notch(frequency: float = 500.0, q: float = 30.0) -> Filter:
    return design("notch", rate=RATE, frequency=frequency, q=q)


def drawn(filter: Filter, name: str) -> Diagram:
    return build(filter, form=name, decomposition="whole").diagram


def halves_of(filter: Filter) -> Halves:
    found = halves(Ratio(*filter.ratio()))
    assert isinstance(found, Halves)
    return found


def with_complement(filter: Filter, name: str) -> Diagram:
    diagram = build(filter, form=name, decomposition="whole", outputs="all").diagram
    assert [diagram.nodes[index].label for index in diagram.outputs] == ["y", "complement"]
    return diagram


# --- the division


def test_the_third_order_half_band_filter() -> None:
    """H = 1/2 [(1/3 + z^-2) / (1 + z^-2 / 3) + z^-1]: standard tables, direct algebra; in float64 the direct form and the
    sum agree to about 4e-16 (recomputed)."""
    half_band = Filter.from_coefficients([1, 3, 3, 1], [6, 0, 2, 0], rate=RATE)
    found = halves_of(half_band)
    # -d1 and d2 come from the roots of the rounded denominator, each rounded once.
    assert [[float(d) for d in section] for section in found.first.sections] == [[1.0, 0.0, pytest.approx(1 / 3, rel=2**-51)]]
    assert (found.first.delay, found.second.sections, found.second.delay) == (0, (), 1)
    assert (found.signs, found.c) == ((1, 1), Fraction(1, 2))
    direct = impulse_response(drawn(half_band, "direct-1"), frames=200)
    for name in FORMS:
        assert np.abs(impulse_response(drawn(half_band, name), frames=200) - direct).max() <= 4e-16
    assert drawn(half_band, "wave-digital").counts() == Counts(1, 4, 3)


@pytest.mark.parametrize("order", [3, 5, 7, 9])
def test_half_band_butterworth_filters_have_the_published_coefficients(order: int) -> None:
    """Sections (d + z^-2) / (1 + d z^-2), d = tan(k pi / 2N)^2: Gazsi, IEEE CAS-32, January 1985, for lattice wave digital
    filters, and Vaidyanathan, Mitra & Neuvo, IEEE ASSP-34, 1986 (from memory; they follow from the poles +-j tan(k pi / 2N)).
    A two-port multiplies by that, or by one less it where that is smaller."""
    published = np.tan(np.arange(1, (order + 1) // 2) * np.pi / (2 * order)) ** 2
    found = halves_of(butterworth(order, RATE / 4))
    sections = [section for half in (found.first, found.second) for section in half.sections]
    assert [section[1] for section in sections] == [0] * len(published)
    np.testing.assert_allclose(sorted(float(section[2]) for section in sections), published, rtol=1e-14)
    multipliers = np.sort(drawn(butterworth(order, RATE / 4), "wave-digital").values[:, 0])
    np.testing.assert_allclose(multipliers, np.sort(np.minimum(published, 1 - published)), rtol=1e-14)


@pytest.mark.parametrize(("order", "first", "second"), [(1, [1], []), (3, [1], [2]), (5, [2, 1], [2]), (7, [2, 1], [2, 2])])
def test_poles_go_to_the_branches_by_turns(order: int, first: list[int], second: list[int]) -> None:
    found = halves_of(butterworth(order))
    assert [len(section) - 1 for section in found.first.sections] == first
    assert [len(section) - 1 for section in found.second.sections] == second


def test_a_split_that_turns_do_not_find() -> None:
    """A0 and A1 in z^-2 with poles of one angle, as half-band filters have them, both inner ones in one branch."""
    first, second = product((1, 0, Fraction(1, 4)), (1, 0, Fraction(1, 8))), (Fraction(1), Fraction(0), Fraction(3, 4))
    left = product(first[::-1], second)
    right = product((Fraction(0), *second[::-1]), first)
    b = [(x + y) / 2 for x, y in zip((*left, 0), right, strict=True)]
    found = halves_of(Filter.from_coefficients(b, product(first, second), rate=RATE))
    assert sorted([len(found.first.sections), len(found.second.sections)]) == [1, 2]
    assert {found.first.delay, found.second.delay} == {0, 1}


def test_notches_and_band_passes_are_sums_with_a_wire() -> None:
    band_pass = design("band-pass", rate=RATE, frequency=500, q=5)
    for filter, signs in ((notch(), {1}), (band_pass, {1, -1})):
        found = halves_of(filter)
        assert (len(found.first.sections), found.second.sections, found.second.delay) == (1, (), 0)
        assert set(found.signs) == signs


@pytest.mark.parametrize("name", FORMS)
def test_a_gain_other_than_one_is_a_multiplication(name: str) -> None:
    b, a = butterworth(1).whole()
    quiet = drawn(Filter.from_coefficients([0.3 * value for value in b], a, rate=RATE), name)
    assert quiet.counts().multiplications == 2
    assert "c0" in [slot.label for slot in quiet.slots]
    expected = 0.3 * impulse_response(drawn(butterworth(1), name), frames=50)
    np.testing.assert_allclose(impulse_response(quiet, frames=50), expected, rtol=0, atol=1e-16)  # two roundings of 0.3 or less


@pytest.mark.parametrize(("filter", "why"), [
    (Filter.from_coefficients([0.0], [1, -0.5], rate=RATE), "its numerator is 0"),
    (Filter.from_coefficients([0.5], rate=RATE), "it is a constant"),
    (butterworth(4), "no division of its poles among two gives its numerator"),
    (design("peak", rate=RATE, frequency=500, gain_db=6, q=1), "its numerator is neither symmetric nor antisymmetric"),
    (Filter.from_coefficients([1.0], [1, -0.5], rate=RATE), "its numerator is neither symmetric nor antisymmetric"),
    (Filter.from_coefficients(*signal.butter(5, 0.02), rate=RATE), r"only to within \d\.\de-\d\d of its gain, and 1\.2e-10 is"),
], ids=["zero", "constant", "even order", "peak", "poles alone", "rounded"])  # fmt: skip
def test_what_is_no_such_sum_is_refused(filter: Filter, why: str) -> None:
    for name in FORMS:
        with pytest.raises(StructureError, match=why):
            build(filter, form=name, decomposition="whole")


def test_a_pole_outside_is_refused() -> None:
    with pytest.raises(StructureError, match="a pole lies on or outside the unit circle"):
        build(Filter.from_coefficients([1, 1], [1, -1], rate=RATE), form="all-pass-sum")


# --- what it computes


families = st.sampled_from(["butterworth", "chebyshev-1", "chebyshev-2", "elliptic"])


@settings(max_examples=12)
@given(
    families, st.integers(0, 5).map(lambda k: 2 * k + 1), st.floats(60.0, 20000.0), st.sampled_from(["low-pass", "high-pass"]),
    st.sampled_from(FORMS),
)
def test_in_float64_it_is_scipys_filter(family: str, order: int, frequency: float, response: str, name: str) -> None:
    asked = {"butterworth": {}, "chebyshev-1": {"ripple_db": 0.5}, "chebyshev-2": {"stopband_db": 50.0},
             "elliptic": {"ripple_db": 0.5, "stopband_db": 50.0}}[family]  # fmt: skip
    filter = design(family, rate=RATE, response=response, order=order, frequency=frequency, **asked)
    diagram, x = drawn(filter, name), np.random.default_rng(1).uniform(-1, 1, FRAMES)
    solved = filter.zeros_poles()
    at_origin = [0.0] * (len(solved.zeros) + solved.delay - len(solved.poles))
    expected = signal.sosfilt(signal.zpk2sos(solved.zeros, [*solved.poles, *at_origin], solved.gain), x)
    y = run_definition(lower(diagram, named_format("float64")), x[:, np.newaxis])[:, 0, 0]
    # scipy's cascade, whose coefficients are rounded too, meets poles of the same distance: the direct form's bound besides.
    cascade = build(filter, form="transposed-2").diagram
    np.testing.assert_allclose(y, expected, rtol=0, atol=rounding_bound(diagram, FRAMES) + rounding_bound(cascade, FRAMES))


@pytest.mark.parametrize("name", FORMS)
@pytest.mark.parametrize("filter", [butterworth(5), notch(), butterworth(3, [2000.0, 5000.0], "band-pass")], ids=range(3))
def test_filter_and_complement_share_the_power_however_coefficients_are_rounded(name: str, filter: Filter) -> None:
    diagram = with_complement(filter, name)
    w = np.linspace(0.0, np.pi, 200)
    for values in (diagram.values, np.round(diagram.values * 16) / 16 + (np.abs(diagram.values) < 1 / 32) / 16):
        y, other = np.moveaxis(diagram.with_values(values).transfer_function().response(w)[:, :, 0], 1, 0)
        # values of the order of 1 over denominators as small as 1e-7 at 6 digits left of 16
        np.testing.assert_allclose(np.abs(y) ** 2 + np.abs(other) ** 2, 1.0, rtol=0, atol=1e-8)
        assert np.abs(y).max() <= 1 + 1e-8


# --- counts


@pytest.mark.parametrize("order", [1, 3, 5, 7])
def test_one_multiplication_for_each_pole(order: int) -> None:
    filter = butterworth(order)
    found = halves_of(filter)
    sections = [section for branch in (found.first, found.second) for section in branch.sections]
    additions = sum(2 * (len(section) - 1) for section in sections) + 1
    firsts = sum(len(branch.sections[0]) - 1 for branch in (found.first, found.second) if branch.sections)
    assert drawn(filter, "all-pass-sum").counts() == Counts(order, additions, order + firsts)
    counts = drawn(filter, "wave-digital").counts()
    assert (counts.multiplications, counts.delays) == (order, order)
    assert 3 * order + 1 <= counts.additions <= 4 * order + 1
    for name, roundings in (("all-pass-sum", len(sections) + 1), ("wave-digital", 2 * order + 1)):
        program = lower(drawn(filter, name), Fixed("Q1.15", coefficients={"bits": 24}))
        assert len(traced_roundings(program)) == roundings


def test_the_explanations_counts() -> None:
    for name in FORMS:
        counts = drawn(butterworth(3), name).counts()
        assert f" {counts.multiplications}, {counts.additions}, {counts.delays}. In fixed" in form(name).docs.replace("\n", " ")


# --- wave digital


@pytest.mark.parametrize("frequency", [50.0, 1000.0, 9000.0, 15000.0, 23000.0])
def test_multipliers_are_at_most_one_half(frequency: float) -> None:
    values = drawn(butterworth(5, frequency), "wave-digital").values
    assert len(values) == 5
    assert ((values > 0) & (values <= 0.5)).all()


@pytest.mark.parametrize(("g", "s"), [("3/4", 0), ("-1/3", 1), ("-3/5", 1), ("-61/100", 2), ("-15/17", 2), ("-16/17", 3)])
def test_the_scale_of_a_port(g: str, s: int) -> None:
    """The least s with 4^s >= (1 - g) / (1 + g): 2, 4, 4.1, 16, 33."""
    assert scale(Fraction(g)) == s


@pytest.mark.parametrize("filter", [butterworth(1, 23000.0), butterworth(5), butterworth(5, 100.0), notch()], ids=range(4))
def test_no_stored_wave_is_larger_than_white_noise_at_the_input(filter: Filter) -> None:
    diagram = drawn(filter, "wave-digital")
    stored = [index for index, node in enumerate(diagram.nodes) if isinstance(node, Delay)]
    assert norms_from_input(diagram, nodes=stored).l2.max() <= 1 + 1e-9


def after_random_states(filter: Filter, rounding: str, frames: int) -> np.ndarray:
    """The states of 16 channels, that many frames without input after random ones."""
    format = Fixed("Q1.15", coefficients={"bits": 16, "point": "coefficient"}, rounding=rounding)
    realization = realize(filter, form="wave-digital", decomposition="whole", format=format)
    memory = realization.memory(16)
    memory.state[:] = np.random.default_rng(7).integers(-(2**15), 2**15, memory.state.shape)
    x = np.zeros((frames, 16), np.int64)
    kernel = compile_kernel(realization.program, Variant(codes=True))
    kernel.call(memory, x, np.empty_like(x), marks=no_marks(), trace=no_trace())
    return memory.state


@pytest.mark.parametrize("filter", [butterworth(3), notch()], ids=["low-pass", "notch"])
def test_it_comes_to_rest_where_registers_round_toward_zero_and_not_by_default(filter: Filter) -> None:
    assert (after_random_states(filter, "toward-zero", 40000) == 0).all()
    left = after_random_states(filter, "half-up", 40000)
    assert np.abs(left).max(axis=0).min() > 1  # a limit cycle of some steps in each channel, and no echo that dies out:
    assert np.abs(after_random_states(filter, "half-up", 400000)).max(axis=0).min() > 1


@pytest.mark.parametrize("word", ["Q1.15", "Q1.23"])
@pytest.mark.parametrize("order", [3, 7])
def test_white_noise_at_half_scale_clips_almost_no_wave(order: int, word: str) -> None:
    """The difference before a multiplier never does: in a register as long as the signal it would thousands of times. The
    stored waves have an rms of at most 0.29 here, and are not quite Gaussian: beyond 1 in less than one frame in 2000."""
    format = Fixed(word, coefficients={"bits": 24, "point": "coefficient"})
    realization = realize(butterworth(order), form="wave-digital", decomposition="whole", format=format)
    x = np.random.default_rng(3).uniform(-0.5, 0.5, (RATE, 1))
    tally = measure(realization, x, (20.0, 20000.0)).tally
    assert tally.saturations <= RATE // 2000
    assert tally.wraps == tally.accumulator_overflows == 0
    quiet = drawn(butterworth(order), "wave-digital")
    marked = [index for index, node in enumerate(quiet.nodes) if isinstance(node, Sum) and node.grow is not None]
    room = [2.0**node.grow for node in quiet.nodes if isinstance(node, Sum) and node.grow is not None]
    assert marked
    assert (norms_from_input(quiet, nodes=marked).l1.ravel() <= room).all()


# --- noise


@pytest.mark.parametrize(("name", "why"), [
    ("all-pass-sum", ""), ("wave-digital", "what the register f3 and the register e3 drop is correlated"),
])  # fmt: skip
def test_predicted_noise_is_measured(name: str, why: str) -> None:
    """The two registers of a wave-digital port drop the same low bits, which the verdict tells and the noise hardly shows."""
    format = Fixed("Q1.15", coefficients={"bits": 32})
    realization = realize(butterworth(3), form=name, decomposition="whole", format=format)
    measured = measure(realization, white(2 * RATE, 1, 1, -21.3), (20.0, 20000.0))
    assert measured.white.holds == (not why)
    assert why in measured.white.reason
    assert measured.noise.dbfs is not None
    assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=max(0.5, measured.noise.interval_db))
