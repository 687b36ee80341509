"""The two state-variable forms: their outputs, their bounds of stability, their noise, and what they refuse."""

from fractions import Fraction
from math import asin, pi

import numpy as np
import pytest
from drawing_reader import crossings, faults_of, page_of
from drawn_forms import cascade, sums
from form_filters import RATE, coefficients, rounding_bound
from hypothesis import given, settings
from hypothesis import strategies as st
from noise_figures import stated
from scipy import signal
from structure_evaluator import response, run, series

from streamhost import design, realize
from streamhost.diagram import Builder, Counts, Diagram
from streamhost.drawing import svg
from streamhost.errors import StructureError
from streamhost.filters import Filter, Polynomials
from streamhost.filters.stability import is_stable
from streamhost.formats import Fixed, named_format
from streamhost.measure.predicted import predicted_noise
from streamhost.program.run import lower, run_definition
from streamhost.structures import Built, build, form
from streamhost.structures.form import Draft
from streamhost.structures.forms.state_variable_delayed import highest_tuning

TRAPEZOIDAL, DELAYED = "state-variable", "state-variable-delayed"
BOTH = (TRAPEZOIDAL, DELAYED)
OUTPUTS = ("low", "band", "high")


def drawn(name: str, b: list[float], a: list[float]) -> Built:
    return build(Filter.from_coefficients(b, a, rate=RATE), form=name, decomposition="whole")


def with_all_outputs(name: str, b: tuple[float, ...], a: tuple[float, ...]) -> Diagram:
    """The section with its main output "y" and those that it offers."""
    builder = Builder()
    draft = Draft(builder, Polynomials(b, a))
    builder.output(form(name).build_section(draft, builder.input()), "y")
    for offered, offer in draft.offered.items():
        builder.output(offer.ref, offered)
    return builder.build()


def impulse(diagram: Diagram, kind: type, frames: int = 40) -> dict[str, list]:
    """The responses of the nodes by their labels, and of "output"."""
    run_frames = run(diagram, [kind(n == 0) for n in range(frames)], kind)
    return {label: [frame[label] for frame in run_frames] for label in run_frames[0]}


# --- what is drawn, exactly


@settings(max_examples=40)
@given(st.integers(-3, 1), st.lists(st.integers(-31, 31), min_size=1, max_size=3))
def test_the_trapezoidal_form_is_the_filter_exactly(octave: int, codes: list[int]) -> None:
    """With A(1) / A(-1) a power of 4 and both of few bits every coefficient is exact in float64."""
    high = Fraction(2)
    low = high * Fraction(4) ** octave
    a1, total = (low - high) / 2, (low + high) / 2
    b = [value / 16 for value in codes]
    a = [1.0, float(a1), float(total - 1)]
    if a[2] != 0:
        assert response(drawn(TRAPEZOIDAL, b, a).diagram, 30, Fraction) == series(b, a, 30)


@settings(max_examples=40)
@given(st.integers(0, 4), st.integers(-5, 12), st.lists(st.integers(-31, 31), min_size=1, max_size=3))
def test_the_delayed_form_is_the_filter_exactly(octave: int, code: int, codes: list[int]) -> None:
    """F a power of two and q of few bits; stable or not."""
    tuning, damping = Fraction(1, 2**octave), Fraction(code, 4)
    b = [value / 16 for value in codes]
    a = [1.0, float(-(2 - tuning * damping - tuning**2)), float(1 - tuning * damping)]
    if a[2] == 0:
        return
    built = drawn(DELAYED, b, a)
    found = coefficients(built.diagram)
    assert (found["F"], found["q"]) == (float(tuning), float(damping))
    responses = impulse(built.diagram, Fraction)
    assert responses["output"] == series(b, a, 40)
    # z^-1 F^2 / A with the band-pass updated after the low-pass: Dattorro, J. Audio Eng. Soc. 45 (1997), from memory
    assert responses["low"] == series([0.0, float(tuning**2)], a, 40)
    assert responses["band"] == series([float(tuning), -float(tuning)], a, 40)
    assert responses["high"] == series([1.0, -2.0, 1.0], a, 40)


@pytest.mark.parametrize("name", BOTH)
@pytest.mark.parametrize("decomposition", ["whole", "cascade"])
@settings(max_examples=10)
@given(st.integers(1, 12), st.integers(0, 2**32 - 1))
def test_stable_filters_in_float64_agree_with_scipy(name: str, decomposition: str, order: int, seed: int) -> None:
    """Whole of order 1 and 2, a cascade of up to six; real poles too. Every stable section is carried."""
    order = order if decomposition == "cascade" else 1 + order % 2
    rng = np.random.default_rng(seed)
    pairs = rng.integers(0, order // 2 + 1)
    upper = 0.85 * rng.uniform(0.1, 1, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    zeros = rng.uniform(0.1, 1, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    real = rng.uniform(-0.85, 0.85, (2, order - 2 * pairs))
    z, p = [*zeros, *zeros.conj(), *real[0]], [*upper, *upper.conj(), *real[1]]
    diagram = build(Filter.from_zeros_poles(z, p, 0.7, rate=RATE), form=name, decomposition=decomposition).diagram
    x = rng.uniform(-1, 1, 60)
    found = [frame["output"] for frame in run(diagram, x.tolist(), float)]
    wanted = signal.sosfilt(signal.zpk2sos(z, p, 0.7), x)
    np.testing.assert_allclose(found, wanted, rtol=0, atol=rounding_bound(diagram))


def test_counts_and_roundings() -> None:
    format = Fixed("Q8.24", coefficients={"bits": 32})
    found = {name: [drawn(name, [0.5, 0.25, 0.125], [1.0, -1.5, 0.75]), drawn(name, [0.5, 0.25], [1.0, -0.5])] for name in BOTH}
    assert [built.diagram.counts() for built in found[TRAPEZOIDAL]] == [Counts(7, 8, 2), Counts(3, 5, 1)]
    assert [built.diagram.counts() for built in found[DELAYED]] == [Counts(6, 6, 2), Counts(3, 3, 1)]
    assert [len(lower(built.diagram, format).roundings) for built in found[TRAPEZOIDAL]] == [6, 3]
    assert [len(lower(built.diagram, format).roundings) for built in found[DELAYED]] == [4, 2]
    assert [len(built.diagram.slots) for name in BOTH for built in found[name]] == [6, 3, 5, 3]


# --- all outputs


def cookbook(kind: str, frequency: float, q: float) -> tuple[list[float], list[float]]:
    """Audio EQ Cookbook (W3C note): low-pass, band-pass of 0 dB, high-pass."""
    w, alpha = 2 * pi * frequency / RATE, np.sin(2 * pi * frequency / RATE) / (2 * q)
    c = np.cos(w)
    b = {"low": [(1 - c) / 2, 1 - c, (1 - c) / 2], "band": [alpha, 0.0, -alpha], "high": [(1 + c) / 2, -1 - c, (1 + c) / 2]}
    return [value / (1 + alpha) for value in b[kind]], [1.0, -2 * c / (1 + alpha), (1 - alpha) / (1 + alpha)]


@pytest.mark.parametrize(("frequency", "q"), [(1000.0, 0.5**0.5), (100.0, 5.0), (15000.0, 0.4)])
def test_the_trapezoidal_outputs_are_the_cookbooks_filters(frequency: float, q: float) -> None:
    b, a = cookbook("low", frequency, q)
    diagram = with_all_outputs(TRAPEZOIDAL, tuple(b), tuple(a))
    assert [diagram.nodes[index].label for index in diagram.outputs] == ["y", *OUTPUTS]
    found = impulse(diagram, float, 400)
    for kind in OUTPUTS:
        gain = 1 / q if kind == "band" else 1.0  # the band-pass of the loop has the gain Q
        wanted = signal.lfilter(*cookbook(kind, frequency, q), np.eye(1, 400)[0])
        bound = 10 * rounding_bound(diagram)  # of the output; the others pass through no other loop
        np.testing.assert_allclose(gain * np.array(found[kind]), wanted, rtol=0, atol=bound)


def test_the_shares_are_the_gains_at_both_ends() -> None:
    b, a = [0.5, 0.25, 0.125], [1.0, -1.2, 0.6]
    for name in BOTH:
        found = coefficients(drawn(name, b, a).diagram)
        assert found["m0"] == pytest.approx(sum(b) / sum(a), rel=1e-15)
    found = coefficients(drawn(TRAPEZOIDAL, b, a).diagram)
    assert found["m2"] == pytest.approx((0.5 - 0.25 + 0.125) / (1 + 1.2 + 0.6), rel=1e-15)


@pytest.mark.parametrize("kind", ["low-pass", "band-pass", "high-pass"])
def test_a_pure_output_takes_one_share(kind: str) -> None:
    """Every share keeps its gain, a 0 too, so that every section is the same graph."""
    built = build(design(kind, rate=RATE, frequency=1000, q=2), form=TRAPEZOIDAL)
    found = coefficients(built.diagram)
    shares = [found["m0"], found["m1"], found["m2"]]
    wanted = {"low-pass": [1, 0, 0], "band-pass": [0, 0.5, 0], "high-pass": [0, 0, 1]}[kind]
    # the cookbook's coefficients are rounded to 2^-53 of 1, and A(1) of 1 kHz is 1 / 60
    assert shares == pytest.approx(wanted, abs=200 * 2.0**-53)


@pytest.mark.parametrize("name", BOTH)
def test_a_first_order_section_offers_low_and_high(name: str) -> None:
    diagram = with_all_outputs(name, (0.25, 0.25), (1.0, -0.5))
    assert [diagram.nodes[index].label for index in diagram.outputs] == ["y", "low", "high"]
    found = impulse(diagram, Fraction)
    low = [0.25, 0.25] if name == TRAPEZOIDAL else [0.5]
    high = [0.75, -0.75] if name == TRAPEZOIDAL else [1.0, -1.0]
    assert found["low"] == series(low, [1.0, -0.5], 40)
    assert found["high"] == series(high, [1.0, -0.5], 40)


# --- stability of the delayed form


# Q, the largest stable F, and its share of the rate: F^2 + 2 F / Q = 4, F = 2 sin(pi f / rate); Dattorro, J. Audio Eng.
# Soc. 45 (1997), from memory, recomputed.
LARGEST = [
    (0.5, 0.828427, 0.135943), (0.7071, 1.03527, 0.173188), (1, 1.236068, 0.212071), (2, 1.561553, 0.285176),
    (10, 1.902498, 0.400199),
]


@pytest.mark.parametrize(("q", "tuning", "share"), LARGEST)
def test_the_largest_stable_frequency(q: float, tuning: float, share: float) -> None:
    found = highest_tuning(1 / q)
    assert found == pytest.approx(tuning, abs=5e-6)  # the table has Q = 0.7071 for the root of 1/2
    assert asin(found / 2) / pi == pytest.approx(share, abs=1e-6)


@given(st.integers(1, 160), st.integers(-16, 160))
def test_it_is_stable_below_and_only_there(f: int, d: int) -> None:
    """0 < Fq < 2 and F^2 + 2 Fq < 4 (the same source), in exact numbers."""
    tuning, damping = Fraction(f, 64), Fraction(d, 32)
    a = (Fraction(1), -(2 - tuning * damping - tuning**2), 1 - tuning * damping)
    inside = 0 < tuning * damping < 2 and tuning**2 + 2 * tuning * damping < 4
    assert is_stable(a) == inside
    if inside:
        assert tuning < highest_tuning(float(damping))


def test_deadbeat() -> None:
    """F = q = 1: A = 1, and every output ends (the same source)."""
    diagram = with_all_outputs(DELAYED, (0.0, 1.0, 0.0), (1.0, 0.0, 0.0))
    found = impulse(diagram, Fraction, 8)
    assert found["low"] == [0, 1, 0, 0, 0, 0, 0, 0]
    assert found["band"] == [1, -1, 0, 0, 0, 0, 0, 0]
    assert found["high"] == [1, -2, 1, 0, 0, 0, 0, 0]


def test_hazards_of_the_delayed_form() -> None:
    def hazards(tuning: float, damping: float) -> tuple[str, ...]:
        a = [1.0, -(2 - tuning * damping - tuning**2), 1 - tuning * damping]
        return tuple(said for said in drawn(DELAYED, [1.0], a).hazards if said.startswith(DELAYED))

    assert hazards(0.25, 1.5) == ()
    assert hazards(0.95, 1.5) == (f"{DELAYED} has F = 0.95 and q = 1.5: tuned up with that q it is unstable from F = 1 on.",)
    assert hazards(1.25, 1.5) == (f"{DELAYED} with F = 1.25 and q = 1.5 is unstable: it needs Fq > 0 and F^2 + 2 Fq < 4.",)
    assert hazards(0.25, -0.5)[0].endswith("is unstable: it needs Fq > 0 and F^2 + 2 Fq < 4.")


# --- noise


@pytest.mark.parametrize(("name", "places"), [
    (TRAPEZOIDAL, {"state": "Q1.31"}), (DELAYED, {"state": "Q1.31", "operand": "Q1.31"}),
])
def test_a_long_state_leaves_the_roundings_of_the_output(name: str, places: dict[str, str]) -> None:
    """Against the noise of one rounding of Q1.15 from 20 Hz to 20 kHz: 2^-30 / 12 times 19980 / 24000, in dBFS."""
    filter = design("low-pass", rate=RATE, frequency=100, q=0.707)
    format = Fixed("Q1.15", coefficients={"bits": 32}, **places)
    found = predicted_noise(realize(filter, form=name, format=format).program, RATE).dbfs
    one = 10 * np.log10(2.0**-30 / 12 * 19980 / 24000) + 10 * np.log10(2)
    assert one <= found < one + 0.3
    if name == TRAPEZOIDAL:
        assert stated(name, f"{found:.1f}".replace("-", ""))


# --- what is refused


@pytest.mark.parametrize("name", BOTH)
@pytest.mark.parametrize(("b", "a", "reason"), [
    ([1.0], [1.0, -0.5, 0.3, 0.1], "its recursion is of order 3, and this form has order 1 or 2"),
    ([1.0, 0.5, 0.5], [1.0, -0.5], "its numerator is of order 2, higher than that of its recursion, 1"),
    ([1.0, 0.5], [1.0], "it has no recursion"),
    ([1.0], [1.0, -1.0], "it has a pole at z = 1"),
    ([1.0], [1.0, -1.5, 0.5], "it has a pole at z = 1"),
])
def test_what_both_refuse(name: str, b: list[float], a: list[float], reason: str) -> None:
    with pytest.raises(StructureError, match=f'form "{name}" cannot carry the filter: {reason}'):
        drawn(name, b, a)


def test_what_one_refuses() -> None:
    with pytest.raises(StructureError, match="a pole at z = -1, where the integrators' gain would be infinite"):
        drawn(TRAPEZOIDAL, [1.0], [1.0, 1.0])
    with pytest.raises(StructureError, match="one real pole outside the unit circle, for which the integrators"):
        drawn(TRAPEZOIDAL, [1.0], [1.0, -2.5, 1.0])
    with pytest.raises(StructureError, match="one real pole above z = 1, for which there is no real F"):
        drawn(DELAYED, [1.0], [1.0, -2.5, 1.0])


@pytest.mark.parametrize("name", BOTH)
def test_poles_on_the_circle_are_carried(name: str) -> None:
    """At 60 degrees and 90 degrees, where the coefficients are exact or rounded by 2^-53: some ten roundings a frame."""
    for a in ([1.0, -1.0, 1.0], [1.0, 0.0, 1.0]):
        found = response(drawn(name, [1.0], a).diagram, 60, float)
        assert found == pytest.approx([float(value) for value in series([1.0], a, 60)], abs=60 * 10 * 2.0**-52)


@pytest.mark.parametrize("name", ["lattice-ladder", "lattice-normalized", TRAPEZOIDAL, DELAYED])
def test_channels_may_differ_in_what_is_filled_up_with_zeros(name: str) -> None:
    """One channel has a section of first order and a wire where the other has two of second order."""
    alone = design("butterworth", rate=RATE, response="low-pass", order=1, frequency=6000)
    both = (alone, design("butterworth", rate=RATE, response="low-pass", order=4, frequency=6000))
    x = np.random.default_rng(1).uniform(-1, 1, (200, 2))
    y = run_definition(lower(build(both, form=name).diagram, named_format("float64")), x)[:, 0, :]
    for channel, filter in enumerate(both):
        diagram = build(filter, form=name).diagram
        wanted = run_definition(lower(diagram, named_format("float64")), x[:, channel : channel + 1])[:, 0, 0]
        np.testing.assert_allclose(y[:, channel], wanted, rtol=0, atol=10 * rounding_bound(diagram))


def test_coupled_states_cannot_be_filled_up() -> None:
    both = (design("butterworth", rate=RATE, response="low-pass", order=1, frequency=6000),
            design("low-pass", rate=RATE, frequency=1000, q=1))
    with pytest.raises(StructureError, match="a section of channel 1 at the length that it has in another channel: its two"):
        build(both, form="coupled")


# --- drawings


@pytest.mark.parametrize("name", BOTH)
@pytest.mark.parametrize("sections", [1, 2, 3])
def test_a_cascade_fits_the_page_without_a_crossing(name: str, sections: int) -> None:
    for odd in [False, True] if sections < 3 else [True]:
        diagram = cascade(name, sections, odd=odd)
        for marks in (set(), sums(diagram)):
            page = page_of(text := svg(diagram, rounded=marks))
            assert faults_of(text, diagram) == []
            assert crossings(page) == 0 and page.scale >= 0.8
    assert cascade(name, 4).hints.general is not None


def test_a_doubling_is_drawn_as_2() -> None:
    assert ">2</" in svg(cascade(TRAPEZOIDAL, 1), values="none")
