"""The instrument `float_particulars`."""

import numpy as np
import pytest

from streamhost import Filter, Fixed, Float, design, realize
from streamhost.commands.documents import document_of
from streamhost.commands.measuring.float_ import lines
from streamhost.measure import float_particulars
from streamhost.measure.floats.low_bits import lost_bits
from streamhost.measure.floats.playing import SEED, noise
from streamhost.signals import white

RATE = 48000


def one_pole(a, format="float32"):
    filter = Filter.from_coefficients([1.0], [1.0, -a], rate=RATE)
    return realize(filter, form="direct-1", decomposition="whole", format=format)


def said(result):
    return "\n".join(lines(result))


def test_the_facts_of_single_precision():
    """IEEE 754-2019, from memory; numpy.finfo agrees."""
    found = float_particulars(one_pole(0.5), quick=True)
    assert found.unit_roundoff == 5.960464477539063e-08
    assert found.smallest_normal == 1.1754943508222875e-38
    assert found.smallest_subnormal == 1.401298464324817e-45
    assert found.largest_exact_integer == 16777216
    assert np.float32(found.largest_exact_integer) + np.float32(1) == found.largest_exact_integer


# Tails


def test_a_tail_that_halves_is_subnormal_for_23_or_24_frames():
    """From 2^-126 down to 2^-149, by 2 a frame; whether the last 1 or 2 steps round up decides which."""
    tail = float_particulars(one_pole(0.5), quick=True).tail
    assert tail.subnormal_frames in (23, 24)
    # Noise up to 0.2 becomes 2^-126 after some 124 frames, and half the time within one more.
    assert 110 < tail.first_frame < 126
    assert tail.for_ever is False
    assert tail.ended_frame == tail.first_frame + tail.subnormal_frames


def test_subnormals_stick_in_the_dead_band_of_fixed_point():
    """Jackson 1969 (Allerton): an integer sticks at floor(0.5 / (1 - a)), 50 for a = 99/100."""
    found = float_particulars(one_pole(0.99), quick=True)
    (state,) = found.tail.states
    assert found.tail.for_ever is True
    assert found.tail.period_frames == 1
    assert abs(state.last_steps) == 50.0
    assert found.tail.ended_frame is None
    # |y| = 2^-126 after ln(2^-126 / |y0|) / ln(0.99) frames, |y0| < 20 dB of full scale times ten
    assert 8300 < found.tail.first_frame < 8700
    assert "for ever" in said(found)
    assert found.tail.tail_ns_per_frame > 0.0


def test_flushed_states_end():
    found = float_particulars(one_pole(0.99, Float("float32", flush_subnormals=True)), quick=True)
    kept = float_particulars(one_pole(0.99), quick=True)
    assert found.flush_subnormals is True
    assert found.tail.subnormal_frames == 0
    assert found.tail.ended_frame == kept.tail.first_frame
    assert found.tail.tail_ns_per_frame is None
    assert "no state becomes subnormal" in said(found)


def test_an_alternating_tail_repeats_with_period_two():
    """A pole at -0.99 sticks at +-50 (Jackson 1969): period 2."""
    tail = float_particulars(one_pole(-0.99), quick=True).tail
    assert (tail.for_ever, tail.period_frames, abs(tail.states[0].last_steps)) == (True, 2, 50.0)


def test_what_has_no_recursion_has_no_tail():
    filter = Filter.from_coefficients([0.5, 0.25, 0.25], rate=RATE)
    tail = float_particulars(realize(filter, form="direct-1", format="float32"), quick=True).tail
    assert tail.first_frame is None
    assert tail.ended_frame == 2


# Drift


def running_sum(format):
    filter = Filter.from_coefficients([1 / 16] * 16, rate=RATE)
    return realize(filter, form="running-sum", decomposition="whole", format=format)


def test_a_running_sum_drifts_as_it_is_told():
    realization = running_sum("float32")
    (drift,) = float_particulars(realization, quick=True).drift
    x = noise(3 * RATE).astype(np.float32).astype(np.float64)
    exact = np.convolve(x, np.ones(16) / 16)[: len(x)]
    steps = RATE // 50
    places = (realization.process(x) - exact)[steps - 1 :: steps]
    assert drift.at_end_dbfs == pytest.approx(20 * np.log10(abs(places[-1])), abs=1e-3)  # float64 sums differ by 1e-15
    moved = np.sqrt(50 * (np.diff(places) ** 2).mean())
    assert drift.found_after_1_s_dbfs == pytest.approx(20 * np.log10(moved), abs=1e-3)
    # An estimate, of errors as long mantissas have them at the rms of each value; subtracting what was added has fewer.
    assert drift.predicted_after_1_s_dbfs == pytest.approx(drift.found_after_1_s_dbfs, abs=3.0)


@pytest.mark.slow
def test_a_longer_run_walks_as_the_root_of_the_time():
    """Its mean square grows by as much in each second: 10 s and 3 s agree, 150 steps scatter by 0.5 dB."""
    long, short = (float_particulars(running_sum("float32"), quick=quick).drift[0] for quick in (False, True))
    assert (long.duration_s, short.duration_s) == (10.0, 3.0)
    assert long.found_after_1_s_dbfs == pytest.approx(short.found_after_1_s_dbfs, abs=1.5)


def test_there_is_no_drift_without_a_running_sum():
    found = float_particulars(one_pole(0.5), quick=True)
    assert found.drift == ()
    assert found.drift_reason == "no running sum is here that loses anything"


# Low-order bits


def test_bits_that_a_sum_drops_are_the_ratio_of_what_it_adds():
    """y = g x + a y1 with known peaks: 1.0 and 2^-9, so that of 24 bits 15 are left."""
    filter = Filter.from_coefficients([1 / 512], [1.0, -511 / 512], rate=RATE)
    program = realize(filter, form="direct-1", decomposition="whole", format="float32").program
    labels = [node.label for node in program.nodes]
    peaks = np.ones(len(labels))
    peaks[labels.index("b0")] = 2.0**-9
    (found,) = lost_bits(program, peaks)
    assert (found.lost_bits, found.mantissa_bits) == (9.0, 24)
    assert found.largest_dbfs == 0.0
    assert found.input_dbfs == pytest.approx(-54.185, abs=0.001)


def test_a_direct_form_near_zero_hertz_drops_more_than_a_transposed_one():
    filter = design("high-pass", rate=RATE, frequency=28.0, q=0.707)
    shared, transposed = (float_particulars(realize(filter, form=form, format="float32"), quick=True)
                          for form in ("direct-2", "transposed-2"))
    assert transposed.lost_bits < 1.0 < 8.0 < shared.lost_bits
    assert "low-order bits of its input" in said(shared)


# What becomes of it


def test_fixed_point_has_none_of_it():
    filter = Filter.from_coefficients([0.5], rate=RATE)
    found = float_particulars(realize(filter, form="direct-1", format=Fixed("Q1.15")))
    assert not found.applies
    assert found.tail is found.flush_subnormals is found.lost_bits is None
    assert said(found) == "Does not apply: Q1.15 is fixed point: its numbers have one step throughout."
    assert document_of(found)["tail"] is None


def test_what_was_done_is_kept_when_broken_off():
    def report(share, doing):
        if share >= 0.5:
            raise KeyboardInterrupt

    found = float_particulars(running_sum("float32"), quick=True, report=report)
    assert not found.complete
    assert found.tail is not None
    assert found.drift == ()


def test_two_runs_agree_but_for_their_timings():
    first, second = (float_particulars(one_pole(0.99), quick=True) for _ in range(2))
    assert first == second


def test_the_noise_is_of_long_mantissas():
    """Of 24 bits a short code would leave the low ones 0, and sums of it would round nothing."""
    low = noise(1000).astype(np.float32).view(np.uint32) & 0xF
    assert len(np.unique(low)) == 16
    assert noise(1000) == pytest.approx(white(1000, 1, SEED, 0.0)[:, 0] / 10, abs=2.0**-26)
