"""The instrument `overflow`: norms, proofs, worst cases, places, and what comes after."""

from itertools import product
from math import log, log2, sqrt

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from streamhost import Filter, Fixed, design, load_preset, realize
from streamhost.commands.main import main
from streamhost.files import read_all
from streamhost.measure import overflow
from streamhost.measure.overflows.counting import counted
from streamhost.program.definition import FixedDefinition
from streamhost.signals import silence

RATE = 48000
NOTHING = silence(64)


def recursive(a, format, b=(1.0,)):
    return realize(Filter.from_coefficients(b, a, rate=RATE), form="direct-1", decomposition="whole", format=format)


def register(found, name):
    return next(each for each in found.registers if each.name == name)


def after(realization, node, x):
    """The value of a register behind the last sample of x, by the definition."""
    program, definition = realization.program, FixedDefinition(realization.program)
    definition.run([round(float(value) * 2**realization.format.input.word.fraction) for value in x])
    return definition.value[node] * 2.0 ** -program.arithmetic[node].quantizer.word.fraction


# Norms and worst cases


def test_the_norms_of_one_pole_are_the_closed_forms():
    """|h| = a^n: L1 = peak = 1 / (1 - a), L2 = 1 / sqrt(1 - a^2); 0.875 is exact in 8 bits."""
    found = overflow(recursive([1.0, -0.875], Fixed("Q4.12", coefficients="Q2.6")), NOTHING, quick=True)
    (output,) = found.registers
    assert output.l1 == pytest.approx(8.0, rel=1e-9)
    assert output.peak == pytest.approx(8.0, rel=1e-6)  # as accurate as peaks are
    assert output.l2 == pytest.approx(1 / sqrt(1 - 0.875**2), rel=1e-9)
    assert output.headroom_bits == pytest.approx(0.0, abs=1e-9)  # Q4.12 holds 8
    assert output.headroom_db == found.headroom_db == pytest.approx(0.0, abs=1e-8)


@pytest.mark.parametrize(("frequency", "l1", "l2", "peak"), [
    # Low-pass, Q = 1 / sqrt 2, 48 kHz: norms of 1 / A by three independent evaluations, computed for this project.
    (100.0, 6422.333, 400.7185, 5890.202), (1000.0, 69.667, 13.7728, 63.839),
])
def test_the_state_of_a_low_pass_in_direct_form_2(frequency, l1, l2, peak):
    filter = design("low-pass", rate=RATE, frequency=frequency, q=2**-0.5)
    realization = realize(filter, form="direct-2", format=Fixed("Q16.24", coefficients="Q2.38"))
    found = register(overflow(realization, NOTHING, judged_only=True), "the register w")
    assert (found.l1, found.l2, found.peak) == pytest.approx((l1, l2, peak), rel=1e-5)  # as many digits as are given
    assert 15 - found.headroom_bits == pytest.approx(log2(l1), abs=1e-3)  # 17.28, 12.65, 6.12 bits are given for these


@pytest.mark.parametrize("form", ["direct-2", "transposed-2"])
def test_the_worst_case_reaches_the_bound_within_rounding(form):
    filter = design("low-pass", rate=RATE, frequency=3000.0, q=4.0)
    realization = realize(filter, form=form, format=Fixed("Q8.24", coefficients="Q2.30"))
    found = overflow(realization, NOTHING, quick=True)
    assert found.proven
    for each, node in zip(found.registers, realization.program.roundings, strict=True):
        reached = abs(after(realization, node, each.worst_input))
        assert reached == pytest.approx(each.worst_reaches, abs=each.bound - each.l1 + 2.0**-20)
        assert each.worst_reaches == pytest.approx(each.l1, rel=2e-6)  # 1e-6 is left out; input ends a step below 1


def test_a_sine_at_the_resonance_reaches_the_peak():
    filter = Filter.from_coefficients([1.0], [1.0, -1.8, 0.9025], rate=RATE)
    realization = realize(filter, form="direct-1", format=Fixed("Q8.24", coefficients="Q2.30"))
    (found,) = overflow(realization, NOTHING, judged_only=True).registers
    w = np.linspace(0.3, 0.35, 100_001)
    at = w[np.abs(1 / (1 - 1.8 * np.exp(-1j * w) + 0.9025 * np.exp(-2j * w))).argmax()]
    y = realization.process(np.cos(at * np.arange(4000)))
    assert np.abs(y[-1000:]).max() == pytest.approx(found.peak, rel=1e-3)  # samples do not all fall on the crest


# Proofs


def small(b, signal="Q1.3", overflow="wrap"):
    return realize(Filter.from_coefficients(b, rate=RATE), form="direct-1", decomposition="whole",
                   format=Fixed(signal, coefficients="Q1.7", overflow=overflow))


@settings(max_examples=12)
@given(st.lists(st.integers(-128, 127), min_size=2, max_size=2).filter(any))
def test_no_input_overflows_what_is_proven_and_one_does_what_is_well_beyond(codes):
    realization = small([code / 128 for code in codes])
    found = overflow(realization, NOTHING, judged_only=True)
    definition = FixedDefinition(realization.program)
    for pair in product(range(-8, 8), repeat=2):
        definition.run(list(pair))
    wrapped = sum(definition.counters.wraps.values())
    # with a word of 4 bits the largest sample is 7/8: what is at most a step beyond the word may be reached or not
    assert not (found.proven and wrapped)
    assert wrapped or found.registers[0].bound < 1.0 + 2 / 8


@pytest.mark.parametrize(("b", "proven"), [([1.0], True), ([-1.0], False), ([0.5, 0.5], True), ([0.5, -0.5], False),
                                           ([0.5, 0.515625], False)])
def test_a_word_is_longer_below_zero_than_above(b, proven):
    """-1 times -1 is beyond Q1.7, 1 - 2^-7 times 1 is not, and 1 - 2^-8, of one sample each, is rounded up to 1."""
    realization = realize(Filter.from_coefficients(b, rate=RATE), form="direct-1",
                          format=Fixed("Q1.7", coefficients="Q2.6", overflow="wrap"))
    found = overflow(realization, NOTHING, quick=True)
    assert found.proven is proven
    assert (found.reason == "no input within full scale can overflow a register") is proven
    for x in ([-1.0, -1.0], [-1.0, 1.0 - 2.0**-7], [1.0 - 2.0**-7] * 2):
        realization.process(np.array(x))
    assert (realization.tally().wraps > 0) is not proven


def test_what_fits_is_not_proven_behind_what_does_not():
    filter = Filter.cascade([Filter.from_coefficients([1.0], [1.0, -0.75], rate=RATE),
                             Filter.from_coefficients([0.125], [1.0, -0.25], rate=RATE)])
    realization = realize(filter, form="direct-1", format=Fixed("Q2.14"))
    found = overflow(realization, NOTHING, judged_only=True)
    first, second = found.registers
    assert (first.fits, second.fits, second.proven, found.proven) == (False, True, False, False)


def test_roundings_count_for_a_proof():
    """A gain of 1 behind another rounding can be half a step above the word, and is not proven."""
    a = [1.0, -0.875]
    tight = recursive(a, Fixed("Q1.15", coefficients="Q2.6"), b=[0.125])
    found = overflow(tight, NOTHING, judged_only=True).registers[0]
    assert found.l1 == pytest.approx(1.0, rel=1e-9)
    assert found.bound > 1.0 + 3 * 2.0**-15  # half a step, 8 times
    assert not found.fits
    assert overflow(recursive(a, Fixed("Q1.15", coefficients="Q2.6"), b=[0.109375]), NOTHING, judged_only=True).proven


@pytest.mark.parametrize(("kind", "l1"), [("wrap", 1.0), ("saturate", 2.0)])
def test_a_sum_that_saturates_on_the_way_is_bounded_term_by_term(kind, l1):
    """1/2 + 1/2 z^-1, then 1 - z^-1: 1/2 - 1/2 z^-2 together, but either term of the second sum alone reaches 1."""
    filter = Filter.cascade([Filter.from_coefficients(b, rate=RATE) for b in ([0.5, 0.5], [1.0, -1.0])])
    realization = realize(filter, form="direct-1", format=Fixed(
        "Q1.15", coefficients="Q2.14", accumulator={"word": "Q2.29", "overflow": kind}))
    sums = [each for each in overflow(realization, NOTHING, judged_only=True).registers if each.kind == "accumulator"]
    assert sums[-1].l1 == pytest.approx(l1, rel=1e-9)
    assert sums[-1].bound >= l1


@pytest.mark.parametrize("fold", [False, True])
def test_a_tapped_line_that_saturates_is_bounded_by_its_taps(fold):
    b = [0.25, -0.5, -0.5, 0.25] if fold else [0.25, -0.5, 0.125]
    realization = realize(Filter.from_coefficients(b, rate=RATE), form="folded" if fold else "direct-1",
                          decomposition="whole", format=Fixed(
                              "Q1.15", coefficients="Q1.15", accumulator={"word": "Q2.30", "overflow": "saturate"}))
    sums = [each for each in overflow(realization, NOTHING, judged_only=True).registers if each.kind == "accumulator"]
    assert sums[-1].l1 == pytest.approx(sum(map(abs, b)), rel=1e-9)


# Counts and places


def test_a_sum_that_wraps_on_the_way_is_no_overflow_and_one_that_ends_outside_is():
    """8 bits: 100 + 100 wraps to -56, and -56 - 120 to 80, which is right; 100 + 100 alone is not."""
    realization = realize(Filter.from_coefficients(np.array([100, 100, -120]) / 128, rate=RATE), form="direct-1",
                          decomposition="whole", format=Fixed("Q1.7", coefficients="Q1.7", accumulator={
                              "word": "Q1.14", "overflow": "wrap"}))
    x = np.full((8, 1), -0.5)
    x[3:] = -1.0  # sums -50, -100, -40, -90, -140 (wraps and stays wrong), -80 ...
    found = overflow(realization, x, quick=True)
    sums = register(found, "the accumulator of y")
    assert sums.l1 == pytest.approx(320 / 128)
    assert (sums.overflows, sums.first_frame) == (1, 4)
    assert found.first_frame == 4


@pytest.mark.parametrize("kind", ["wrap", "saturate"])
def test_counts_and_first_frames_are_those_of_the_definition(kind):
    format = Fixed("Q2.14", coefficients="Q2.14", overflow=kind)
    realization = realize(design("low-pass", rate=RATE, frequency=2000.0, q=8.0), form="transposed-2", format=format)
    x = np.sin(2 * np.pi * 2000.0 / RATE * np.arange(6000))[:, None] * np.linspace(0.0, 1.0, 6000)[:, None]
    found = overflow(realization, x, quick=True)
    definition = FixedDefinition(realization.program)
    first = {}
    for frame, value in enumerate(np.rint(x[:, 0] * 2**14).astype(int).tolist()):
        definition.step(value)
        for node in {**definition.counters.wraps, **definition.counters.saturations}:
            first.setdefault(node, frame)
    numbers = {**definition.counters.wraps, **definition.counters.saturations}
    places = [each for each in found.registers if each.kind == "register"]
    assert [each.overflows for each in places] == [numbers.get(node, 0) for node in realization.program.roundings]
    assert [each.first_frame for each in places] == [first.get(node) for node in realization.program.roundings]
    assert found.first_frame == min(first.values())


def test_a_first_overflow_behind_a_block_is_found():
    realization = small([0.99, 0.9], "Q1.7")
    x = np.zeros((9000, 1))
    x[8999], x[8998] = -1.0, -1.0
    counts = counted(realization, x)
    assert counts.first.max() == 8999
    assert counts.number.sum() == 1


# Afterwards


def test_a_saturated_pole_joins_its_ideal_when_the_closed_form_says():
    """The ideal is at -8 where the register stands at -4: 4 x 0.875^n is left, until it is below what roundings make."""
    found = overflow(recursive([1.0, -0.875], Fixed("Q3.21", coefficients="Q2.6")), NOTHING, quick=True)
    constant = next(each for each in found.recoveries if each.burst == "a constant" and each.after == "silence")
    allowed = 10 ** (constant.allowed_dbfs / 20)
    assert allowed == pytest.approx(0.5 * 2.0**-21 * 8.0, rel=1e-3)  # half a step, 8 times (the L1 norm)
    frames = log(allowed / 4.0) / log(0.875)
    assert constant.recovery_frames == pytest.approx(frames, abs=3)  # its own roundings add or take as much as is allowed
    assert constant.recovery_s == constant.recovery_frames / RATE
    assert found.oscillates is False


def corner(overflow, a=(1.0, -0.75, 0.75)):
    return recursive(a, Fixed("Q1.3", coefficients="Q2.6", rounding="half-away", rounding_place="product",
                              overflow=overflow, feedback="negated"))


@pytest.mark.parametrize(("kind", "orbit"), [
    ("wrap", [-6, 6, -6, 6, -6, 6]), ("saturate", [7, 0, -5, -4, 1, 4, 2, -1, -3, -1, 1, 2])])
def test_the_overflow_oscillation_of_four_bits(kind, orbit):
    """y = Q(3/4 y1) + Q(-3/4 y2) from 3/4, -3/4, in eighths (Oppenheim & Schafer, ch. 6, from memory; recomputed)."""
    realization = corner(kind)
    definition = FixedDefinition(realization.program)
    for line in definition.lines:
        definition.lines[line][0] = {"y1": 6, "y2": -6}[definition.nodes[line].label]
    assert [value[0] for value in definition.run([0] * len(orbit))] == orbit
    found = overflow(realization, NOTHING, quick=True)
    assert found.oscillates is (kind == "wrap")
    if found.oscillates:
        assert 2 in {each.period_frames for each in found.recoveries if each.after == "silence"}


# M. L. Ebert, J. E. Mazo, M. G. Taylor, Bell System Technical Journal 48 (1969): wrapping is free of oscillations if and
# only if |a1| + |a2| < 1, saturation in every stable case. The cases and what they did are recomputed.
@pytest.mark.parametrize(("a1", "a2", "free"), [
    (-0.5, 0.4, True), (-1.0, 0.5, False), (-0.75, 0.75, False),
    *(pytest.param(*case, marks=pytest.mark.slow) for case in (
        (0.55, 0.44, True), (-0.3, -0.6, True), (0.0, 0.95, True), (1.0, 0.5, False), (-1.6, 0.8, False))),
])
def test_overflow_oscillations_are_found_where_there_are_some(a1, a2, free):
    wrapping, saturating = (overflow(recursive([1.0, a1, a2], Fixed("Q1.15", coefficients="Q2.14", overflow=kind)), NOTHING,
                                     quick=True) for kind in ("wrap", "saturate"))
    assert wrapping.oscillates is not free
    assert saturating.oscillates is False
    if not free:
        assert any(each.period_frames is not None for each in wrapping.recoveries if each.oscillates)
        assert all(each.recovery_frames is None for each in wrapping.recoveries if each.oscillates)


# Other formats, interruption, files


def test_floating_point_has_no_words():
    found = overflow(recursive([1.0, -0.5], "float32"), NOTHING)
    assert found.registers == ()
    assert found.headroom_db == float("inf")
    assert "floating point" in found.reason


def test_what_is_found_stays_when_the_bursts_are_broken_off():
    def report(share, doing):
        if "constant" in doing:
            raise KeyboardInterrupt

    found = overflow(recursive([1.0, -0.875], Fixed("Q3.21", coefficients="Q2.6")), NOTHING, report=report)
    assert found.complete is False
    assert len(found.registers) == 1
    assert {each.burst for each in found.recoveries} == {"the worst case of the register y"}


def test_the_command_writes_the_worst_case_and_limits_headroom(tmp_path, capsys):
    preset = tmp_path / "peak.toml"
    preset.write_text('rate = 48000\n[[filter]]\nkind = "peak"\nfrequency = 1000\ngain_db = 6\nq = 1\n[structure]\n'
                      'form = "direct-1"\n[format]\nsignal = "Q1.15"\n[limits]\nheadroom_db = 0\n', encoding="utf-8")
    folder = tmp_path / "worst"
    assert main(["measure", str(preset), "--only", "overflow", "--quick", "--output", str(folder)]) == 1
    shown = capsys.readouterr().out
    (path,) = folder.iterdir()
    x, info = read_all(path)
    found = overflow(realize(load_preset(str(preset)).filter, form="direct-1", format=Fixed("Q1.15")), NOTHING, quick=True)
    assert info.rate == 48000
    assert np.array_equal(x[:, 0], found.registers[0].worst_input.astype(np.float32))
    assert f"Misses headroom_db: −{-found.headroom_db:.1f}, at least 0 dB (the register y)." in shown
    assert "Not proven" in shown
