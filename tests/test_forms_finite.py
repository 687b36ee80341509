"""The forms for finite responses: folded, lattice, running sum, frequency sampling; and a cascade of zeros."""

from fractions import Fraction

import numpy as np
import pytest
from diagram_examples import fir as line_of_taps
from form_filters import rounding_bound
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from native_runs import busy
from scipy import signal

from streamhost import Filter, Fixed, design, realize
from streamhost.diagram import Builder, Counts, Diagram, minus
from streamhost.diagram.fan import impulse_response
from streamhost.diagram.norms import norms_from_input
from streamhost.errors import DiagramError, FormatError, StructureError
from streamhost.filters.exact import exactly
from streamhost.filters.stability import is_stable
from streamhost.formats import named_format
from streamhost.measure import measure
from streamhost.program.run import lower, run_definition
from streamhost.program.sources import traced_roundings
from streamhost.signals import white
from streamhost.structures import Built, build
from streamhost.structures.forms.fir_lattice import reflections
from streamhost.structures.forms.frequency_sampling import radius, resonators
from streamhost.structures.forms.running_sum import Sums, sums_of

RATE = 48000
FRAMES = 200
TAP = st.floats(-1.0, 1.0).filter(lambda value: abs(value) > 1e-3)


def whole(name: str, taps: object) -> Built:
    return build(Filter.from_coefficients(taps, rate=RATE), form=name, decomposition="whole")


def refused(name: str, taps: object, why: str, a: object = (1.0,)) -> None:
    with pytest.raises(StructureError, match=f'form "{name}" cannot carry the filter: .*{why}'):
        build(Filter.from_coefficients(taps, a, rate=RATE), form=name, decomposition="whole")


def check_against_scipy(diagram: Diagram, taps: object) -> None:
    """In float64, on noise, within what the roundings of both can do."""
    x = np.random.default_rng(1).uniform(-1, 1, FRAMES)
    y = run_definition(lower(diagram, named_format("float64")), x[:, np.newaxis])[:, 0, 0]
    direct = rounding_bound(whole("direct-1", taps).diagram, FRAMES)
    np.testing.assert_allclose(y, signal.lfilter(taps, [1.0], x), rtol=0, atol=rounding_bound(diagram, FRAMES) + direct)


@pytest.mark.parametrize("name", ["folded", "fir-lattice", "running-sum", "frequency-sampling"])
def test_a_recursion_is_refused(name: str) -> None:
    refused(name, [1.0, 1.0], "it has a recursion, and this form is for finite responses", a=[1.0, -0.5])


# --- folded


def symmetric(half: list[float], odd_length: bool, sign: int) -> list[float]:
    middle = [half[0] if sign > 0 else 0.0] if odd_length else []
    return [*half, *middle, *(sign * value for value in reversed(half))]


@settings(max_examples=30)
@given(st.lists(TAP, min_size=1, max_size=12), st.booleans(), st.sampled_from([1, -1]), st.integers(0, 2))
def test_folded_is_scipys_filter(half: list[float], odd_length: bool, sign: int, lead: int) -> None:
    taps = [*[0.0] * lead, *symmetric(half, odd_length, sign)]
    check_against_scipy(whole("folded", taps).diagram, taps)


@pytest.mark.parametrize("length", [1, 2, 3, 8, 9, 16, 17, 24, 64, 65])
@pytest.mark.parametrize("sign", [1, -1])
def test_folded_halves_the_multiplications(length: int, sign: int) -> None:
    """M taps: M/2 multiplications, M - 1 additions, M - 1 words (textbook counts, by construction); an antisymmetric
    filter of odd length has no middle tap to multiply or add."""
    half = [0.01 * (k + 1) for k in range(length // 2)]
    taps = symmetric(half or [0.5], length % 2 == 1, sign) if length > 1 else [0.5]
    middle = length % 2 == 1 and sign < 0 and length > 1
    expected = Counts((length + 1) // 2 - middle, length - 1 - middle, length - 1)
    counts = whole("folded", taps).diagram.counts()
    assert (counts.multiplications, counts.delays) == (expected.multiplications, expected.delays)
    # A folded line of taps counts the addition of its middle tap whether it is 0 or not.
    assert counts.additions == expected.additions + (middle and length > 16)


@pytest.mark.parametrize("format", [
    Fixed("Q1.15", coefficients={"bits": 16}),
    Fixed("Q1.15", coefficients={"bits": 16}, pre_sum="half"),
    Fixed("Q1.15", coefficients={"bits": 16}, pre_sum="signal"),
    Fixed(arithmetic="16x16+40", product={"bits": 20, "rounding": "half-up"}),
    Fixed(arithmetic="16x16-32"),
], ids=["exact", "half", "signal", "product", "saturating"])  # fmt: skip
@pytest.mark.parametrize(("length", "sign"), [(9, 1), (8, 1), (8, -1), (7, -1)])
def test_drawn_tap_by_tap_it_has_the_bits_of_a_folded_line(format: Fixed, length: int, sign: int) -> None:
    half = np.random.default_rng(3).uniform(-0.4, 0.4, length // 2).tolist()
    taps = symmetric(half, length % 2 == 1, sign)
    one_node = line_of_taps(taps, fold="even" if sign > 0 else "odd")
    x = busy(150, 1, 2)
    drawn, line = (run_definition(lower(diagram, format), x) for diagram in (whole("folded", taps).diagram, one_node))
    np.testing.assert_array_equal(drawn, line)


def test_folded_takes_pairs_that_rounding_made_unequal() -> None:
    taps = signal.firwin(15, 0.3)
    taps[2] = np.nextafter(taps[2], 1)
    built = whole("folded", taps)
    assert built.diagram.counts().multiplications == 8
    check_against_scipy(built.diagram, taps)
    taps[2] += 1e-14
    refused("folded", taps, "its 15 taps are neither symmetric nor antisymmetric")


def test_folded_has_one_rounding() -> None:
    for length in (9, 30):
        program = lower(whole("folded", np.hanning(length + 2)[1:-1]).diagram, Fixed("Q1.15", coefficients={"bits": 16}))
        assert len(traced_roundings(program)) == 1


# --- lattice


def step_up(ks: list[Fraction]) -> list[Fraction]:
    a = [Fraction(1)]
    for k in ks:
        a = [x + k * y for x, y in zip([*a, Fraction(0)], [Fraction(0), *reversed(a)], strict=True)]
    return a


DYADIC = st.integers(-15, 15).map(lambda code: Fraction(code, 16))


@given(st.lists(DYADIC, min_size=1, max_size=10), st.integers(1, 8))
def test_step_down_undoes_step_up_exactly(ks: list[Fraction], gain: int) -> None:
    assert reflections(tuple(gain * tap for tap in step_up(ks))) == (tuple(ks), 0)


def test_the_textbooks_lattice() -> None:
    """A(z) = 1 - 0.9 z^-1 + 0.64 z^-2 - 0.576 z^-3 (Oppenheim & Schafer, from memory; recomputed; with a(M) = +k(M))."""
    ks, stop = reflections(tuple(Fraction(tap) for tap in ("1", "-0.9", "0.64", "-0.576")))
    assert stop == 0
    assert [float(k) for k in ks] == pytest.approx([-0.672757475, 0.181974907, -0.576], abs=5e-10)
    diagram = whole("fir-lattice", [1, -0.9, 0.64, -0.576]).diagram
    stored = dict.fromkeys(diagram.values[:, 0].tolist())  # two multipliers a stage have the same
    np.testing.assert_allclose(list(stored), [1.0, *map(float, ks)], rtol=1e-15)  # 0.9 is not a binary fraction


@given(st.lists(st.floats(-2.0, 2.0), min_size=1, max_size=8))
def test_coefficients_below_1_say_that_all_zeros_are_inside(rest: list[float]) -> None:
    taps = exactly([1.0, *rest])
    while len(taps) > 1 and taps[-1] == 0:
        taps = taps[:-1]
    ks, stop = reflections(taps)
    assert (stop == 0 and all(abs(k) < 1 for k in ks)) == is_stable(taps)


@settings(max_examples=30)
@given(st.lists(st.floats(-0.95, 0.95), min_size=1, max_size=11), st.floats(0.1, 2.0), st.integers(0, 2))
def test_the_lattice_is_scipys_filter(ks: list[float], gain: float, lead: int) -> None:
    taps = [0.0] * lead + [gain * float(tap) for tap in step_up([Fraction(k) for k in ks])]
    assume(taps[-1] != 0)
    diagram = whole("fir-lattice", taps).diagram
    assert diagram.counts() == Counts(2 * len(ks), 2 * len(ks) - 1, len(ks) + lead)
    check_against_scipy(diagram, taps)


def test_lattice_of_maximum_phase_and_of_many_taps() -> None:
    check_against_scipy(whole("fir-lattice", [0.25, -0.8, 0.9]).diagram, [0.25, -0.8, 0.9])
    many = [0.9**k * (-1) ** (k // 3) for k in range(40)]
    check_against_scipy(whole("fir-lattice", many).diagram, many)


def test_lattice_roundings_hazards_and_refusals() -> None:
    program = lower(whole("fir-lattice", [0.5, 0.2, 0.1, 0.05]).diagram, Fixed("Q1.15", coefficients={"bits": 16}))
    assert len(traced_roundings(program)) == 5
    assert whole("fir-lattice", [0.5, 0.2, 0.1]).hazards == ()
    assert "within 5.0e-04 of 1" in whole("fir-lattice", [1.0, 0.3, 0.9995]).hazards[0]
    for taps in ([0.25, 0.5, 0.25], [0.5, 0.0, -0.5], [0.5, 0.5]):
        refused("fir-lattice", taps, "first and last taps are equally large, so that k of the last stage is 1 or -1")
    refused("fir-lattice", [float(tap) for tap in step_up([Fraction(1), Fraction(1, 2)])], "k of stage 1 is 1 or -1")
    refused("fir-lattice", [0.0], "its numerator is 0")
    refused("fir-lattice", [1.0] * 64 + [0.5], "it has 65 taps, and up to 64 are drawn")


# --- running sum


def powers_of_a_sum(length: int, stages: int) -> np.ndarray:
    taps = np.ones(1, np.int64)
    for _ in range(stages):
        taps = np.convolve(taps, np.ones(length, np.int64))
    return taps


def sum_in_codes(diagram: Diagram, codes: np.ndarray, integer: int, fraction: int = 15) -> np.ndarray:
    program = lower(diagram, Fixed(f"Q1.{fraction}", output=f"Q{integer}.{fraction}"))
    y = run_definition(program, codes[:, np.newaxis] / 2.0**fraction)[:, 0, 0]
    return np.asarray(y * 2.0**fraction, dtype=np.int64)


def by_hand(length: int, grow: int | None) -> Diagram:
    builder = Builder()
    x, before = builder.input(), builder.delay("y1")
    y = builder.sum(x, minus(builder.delay("old", x, length)), before, label="y", grow=grow)
    before.takes(y)
    builder.output(y)
    return builder.build()


NOISE = np.random.default_rng(4).integers(-(2**15), 2**15, 2000)
WORST = np.full(200, -(2**15))


def test_64_values_of_16_bits_need_22_bits_and_no_more() -> None:
    """16-bit noise: 22 bits that wrap equal convolution exactly, 16 are wrong. Constant -32768: 22 bits -2097152, 21 bits 0
    (integer simulation; E. Hogenauer, IEEE ASSP-29, 1981: exact if the register holds the range of the output)."""
    built = whole("running-sum", np.ones(64))
    for codes in (NOISE, WORST):
        np.testing.assert_array_equal(sum_in_codes(built.diagram, codes, 7), np.convolve(codes, np.ones(64, int))[: len(codes)])
    assert sum_in_codes(built.diagram, WORST, 7)[-1] == -2097152
    assert sum_in_codes(by_hand(64, 6), WORST, 7)[-1] == -2097152
    assert sum_in_codes(by_hand(64, 5), WORST, 7)[-1] == 0
    assert (sum_in_codes(by_hand(64, 0), NOISE, 7) != np.convolve(NOISE, np.ones(64, int))[:2000]).mean() > 0.5


def test_a_sum_that_saturates_is_wrong_for_ever() -> None:
    codes = np.concatenate((WORST, np.zeros(500, int)))
    assert sum_in_codes(whole("running-sum", np.ones(64)).diagram, codes, 7)[-1] == 0
    assert sum_in_codes(by_hand(64, None), codes, 7)[-1] != 0  # without the mark: in the signal's word, which saturates
    with pytest.raises(FormatError, match="66 bits, and a register has at most 64"):
        lower(by_hand(64, 34), Fixed("Q1.31"))
    builder = Builder()
    with pytest.raises(DiagramError, match="Saturation there is refused"):
        builder.sum(builder.input(), grow=6, overflow="saturate")


@pytest.mark.parametrize(("stages", "length", "bits"), [(1, 8, 3), (1, 100, 7), (4, 25, 19), (3, 64, 18), (5, 32, 25)])
def test_growth(stages: int, length: int, bits: int) -> None:
    """ceil(N log2 RM): E. Hogenauer, as above; 4 stages of 25 are the paper's example."""
    taps = powers_of_a_sum(length, stages)
    found = sums_of(exactly(taps.tolist()))
    assert found == Sums(length, stages, Fraction(1))
    assert found.growth(stages) == bits
    diagram = whole("running-sum", taps).diagram
    marks = [node.grow for node in diagram.nodes if node.kind == "sum"]
    assert marks == [int(np.ceil(k * np.log2(length))) for k in range(1, stages + 1)]
    assert diagram.counts() == Counts(0, 2 * stages, stages * (length + 1))
    codes = np.concatenate((NOISE[:300] >> 10, WORST >> 10))  # 6 bits, so that the output has a word
    np.testing.assert_array_equal(sum_in_codes(diagram, codes, 1 + bits, 5), np.convolve(codes, taps)[:500])


@settings(max_examples=40)
@given(st.integers(2, 40), st.integers(1, 4), st.floats(1e-3, 1.0), st.integers(0, 1000))
def test_sums_are_known_by_their_taps(length: int, stages: int, c: float, place: int) -> None:
    taps = np.full(length, c ** (1 / stages))
    for _ in range(stages - 1):
        taps = np.convolve(taps, np.full(length, c ** (1 / stages)))
    found = sums_of(exactly(taps.tolist()))
    assert found is not None and (found.length, found.stages) == (length, stages)
    assert float(found.c) == pytest.approx(c, rel=1e-13)  # powers and roots of c, a few roundings each
    taps[place % len(taps)] *= 1 + 1e-11
    assert sums_of(exactly(taps.tolist())) is None


def test_moving_average() -> None:
    """M points: nulls at multiples of rate / M, gain 1/M for white noise; the first side lobe of 8 is -12.797 dB, of 64
    -13.254 dB (Dirichlet kernel, computed on a fine grid)."""
    for length, lobe in ((8, -12.797), (64, -13.254)):
        average = design("moving-average", rate=RATE, length=length)
        diagram = build(average, form="running-sum", decomposition="whole").diagram
        assert diagram.counts() == Counts(1, 2, length + 1)
        h = diagram.transfer_function()
        nulls = 2 * np.pi * np.arange(1, length // 2 + 1) / length
        assert np.abs(h.response(nulls)).max() < 1e-15
        beyond = np.abs(h.response(np.linspace(nulls[0], nulls[1], 4001)))
        assert 20 * np.log10(beyond.max()) == pytest.approx(lobe, abs=5e-4)
        assert norms_from_input(diagram, nodes=diagram.outputs).l2[0] ** 2 == pytest.approx(1 / length, rel=1e-12)


def test_a_running_sum_is_recursive_and_its_response_ends() -> None:
    diagram = whole("running-sum", powers_of_a_sum(10, 2) / 100).diagram
    assert diagram.has_loop()
    assert diagram.response_ends()
    np.testing.assert_array_equal(diagram.transfer_function().denominator, [1.0])


def test_its_pole_harms_floating_point_only() -> None:
    average = design("moving-average", rate=RATE, length=100)
    fixed, floating = (realize(average, form="running-sum", decomposition="whole", format=f) for f in ("16x16+40", "float32"))
    assert (fixed.unstable, floating.unstable) == (0, 1)
    assert floating.unstable_since == "as drawn"
    x = np.concatenate((np.random.default_rng(1).uniform(-1, 1, 20000), np.zeros(200)))
    assert fixed.process(x)[-1] == 0
    assert floating.process(x)[-1] != 0  # what was lost in 20,000 additions stays


def test_it_has_the_bits_of_direct_1() -> None:
    """The same sum, exact in both, rounded once: c = 1/64 is no rounding of its own."""
    average = design("moving-average", rate=RATE, length=64)
    x = np.random.default_rng(5).uniform(-1, 1, (300, 1))
    by_form = [realize(average, form=form, decomposition="whole", format="16x16+40") for form in ("running-sum", "direct-1")]
    np.testing.assert_array_equal(*(run_definition(realization.program, x) for realization in by_form))
    assert [len(traced_roundings(realization.program)) for realization in by_form] == [1, 1]


def test_its_noise_is_predicted() -> None:
    average = design("moving-average", rate=RATE, length=64)
    realization = realize(average, form="running-sum", decomposition="whole", format="16x16+40")
    measured = measure(realization, white(RATE, 1, 1, -10.0), (20.0, 20000.0))
    assert measured.white.holds
    assert measured.noise.dbfs is not None
    assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=0.5)


def test_running_sum_refusals() -> None:
    refused("running-sum", [0.5, 0.25, 0.5], "it is no running sum")
    refused("running-sum", [0.5], "it is no running sum")
    refused("running-sum", [1.0, 0.0, 0.0], "it is no running sum")
    refused("running-sum", powers_of_a_sum(4, 16).astype(float), "16 stages of 4 add 32 bits to the signal, and 30 are")


# --- frequency sampling


@settings(max_examples=8)
@given(st.lists(TAP, min_size=4, max_size=20))
def test_frequency_sampling_is_scipys_filter(taps: list[float]) -> None:
    diagram = whole("frequency-sampling", taps).diagram
    check_against_scipy(diagram, taps)
    late = impulse_response(diagram, frames=6 * len(taps))[len(taps) :, 0]
    assert np.abs(late).max() <= rounding_bound(diagram, 6 * len(taps))


@pytest.mark.parametrize("length", [4, 5, 16, 33])
def test_each_sample_has_its_resonator(length: int) -> None:
    """The samples by numpy's transform of the taps over r^n, at 2 pi k / L."""
    taps = np.random.default_rng(length).uniform(-0.5, 0.5, length)
    r = float(radius(length))
    samples = np.fft.fft(taps / r ** np.arange(length))
    found = resonators(exactly(taps.tolist()))
    assert [each.k for each in found] == list(range(length // 2 + 1))
    for each in found:
        share = (1 if 2 * each.k in (0, length) else 2) / length
        assert each.b[0] == pytest.approx(share * samples[each.k].real, abs=1e-13)
        pole = np.roots([1.0, *each.a])[0]
        assert abs(pole) == pytest.approx(r, abs=1e-9)
        assert abs(np.angle(pole)) == pytest.approx(2 * np.pi * each.k / length, abs=1e-9)
    if length % 2 == 0:
        counts = whole("frequency-sampling", taps).diagram.counts()
        assert counts == Counts(2 * length + 1, 2 * length, 2 * length + 1)


def test_a_sample_of_0_has_no_resonator() -> None:
    length, k = 12, 3
    r = float(radius(length))
    n = np.arange(length)
    taps = np.where(n % 2, 0.0, r**n * (-1.0) ** (n // 2)) / length  # cos(2 pi 3 n / 12), exact zeros in between
    assert [each.k for each in resonators(exactly(taps.tolist()))] == [k]
    check_against_scipy(whole("frequency-sampling", taps).diagram, taps)


def test_frequency_sampling_roundings_hazard_and_refusals() -> None:
    built = whole("frequency-sampling", [0.1, 0.2, 0.3, 0.25, 0.15, 0.05])
    program = lower(built.diagram, Fixed("Q1.15", coefficients={"bits": 24}))
    assert len(traced_roundings(program)) == 5
    assert "poles that zeros cancel" in built.hazards[0]
    refused("frequency-sampling", [0.5, 0.25, 0.5], "it has 3 taps, and 4 to 128 can be drawn")
    refused("frequency-sampling", [0.0], "its numerator is 0")


# --- zeros in cascade: no form of its own


@pytest.mark.parametrize("ordering", ["outward", "inward"])
def test_a_cascade_of_zeros_is_the_cascade_of_direct_1(ordering: str) -> None:
    taps = signal.remez(32, [0, 0.1, 0.15, 0.5], [1, 0])
    filter = Filter.from_coefficients(taps, rate=RATE)
    diagram = build(filter, form="direct-1", decomposition="cascade", ordering=ordering).diagram
    assert diagram.counts() == Counts(47, 31, 31)
    assert not diagram.has_loop()
    check_against_scipy(diagram, taps)
