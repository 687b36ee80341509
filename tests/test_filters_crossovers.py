"""Crossovers: filters with several named outputs, what their outputs add up to, and how such filters are refused."""

from math import log10, sqrt

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from levels import decibels
from scipy import signal

from streamhost.errors import FilterError
from streamhost.filters import Filter, design
from streamhost.presets.writing import preset_text

RATE = 48000.0
HERTZ = np.append(np.geomspace(1.0, 23999.0, 500), 24000.0)

# A pole is rounded by up to 2^-53, which at 20 Hz is 4.3e-14 of its distance from z = 1; that moves the response by up to
# that times the distance over the one from the circle (twice the Q, at most 2.7), and 8 poles make 8 * 8.7 dB of it: 8e-12.
ROUNDED_DB = 1e-11


def crossover(kind="linkwitz-riley", rate=RATE, **parameters):
    return design(kind, rate=rate, **parameters)


def turns_by_half(order):
    return -1.0 if order % 4 == 2 else 1.0


frequencies = st.floats(20.0, 20000.0)


# S. Linkwitz, J. Audio Eng. Soc. 24 (1976): both outputs are 6.02 dB down and in phase at the crossover, and the sum is
# all-pass.


@pytest.mark.parametrize("order", [2, 4, 6, 8])
@settings(max_examples=25, deadline=None)
@given(frequency=frequencies)
def test_linkwitz_riley_outputs_meet_in_phase_and_add_up_to_an_all_pass(order, frequency):
    f = crossover(order=order, frequency=frequency)
    assert f.outputs == ("low", "high")
    assert f.order == order
    assert decibels(f.response(frequency)) == pytest.approx([-20 * log10(2)] * 2, abs=ROUNDED_DB)
    low, high = f.response(HERTZ)
    assert np.abs(decibels(low + high)).max() < ROUNDED_DB
    both = np.minimum(np.abs(low), np.abs(high)) > 1e-9
    assert np.abs(np.angle(low * high.conj()))[both].max() < ROUNDED_DB
    assert f.response(0.0) == pytest.approx([1.0, 0.0], abs=ROUNDED_DB)
    assert np.abs(f.response(24000.0)) == pytest.approx([0.0, 1.0], abs=ROUNDED_DB)


@pytest.mark.parametrize("order", [2, 4, 6, 8])
@pytest.mark.parametrize("frequency", [100.0, 1800.0, 9000.0])
def test_linkwitz_riley_is_butterworth_twice(order, frequency):
    f = crossover(order=order, frequency=frequency)
    for name, response, sign in (("low", "lowpass", 1.0), ("high", "highpass", turns_by_half(order))):
        z, p, k = signal.butter(order // 2, frequency, response, fs=RATE, output="zpk")
        twice = Filter.cascade([Filter.from_zeros_poles(z, p, k, rate=RATE)] * 2)
        # scipy rounds its poles and its gain once more than is done here: at 100 Hz that is some 1e-12 of the gain
        assert f.output(name).response(HERTZ) == pytest.approx(sign * twice.response(HERTZ), abs=1e-10)


# Section Q of Butterworth filters, order: Q (standard tables, common practice; from memory; digits of the table).
SECTION_Q = {2: [0.7071], 4: [0.5412, 1.3066], 6: [0.5176, 0.7071, 1.9319], 8: [0.5098, 0.6013, 0.9, 2.5629]}


@pytest.mark.parametrize("half", SECTION_Q)
def test_the_poles_are_those_of_the_tables(half):
    kind, order = ("linkwitz-riley", 2 * half) if half <= 4 else ("butterworth-crossover", half)
    f = crossover(kind, order=order, frequency=3000.0)
    low, high = f.output("low").zeros_poles(), f.output("high").zeros_poles()
    assert low.poles == high.poles
    analog = [(pole - 1) / (pole + 1) for pole in low.poles if pole.imag > 0]
    found = sorted(abs(s) / (-2 * s.real) for s in analog)
    assert found == pytest.approx(sorted(SECTION_Q[half] * (order // half)), abs=5e-5)


@pytest.mark.parametrize("order", range(1, 17))
@settings(max_examples=8, deadline=None)
@given(frequency=st.floats(200.0, 20000.0))
def test_butterworth_powers_add_up_to_one_and_odd_orders_to_an_all_pass(order, frequency):
    f = crossover("butterworth-crossover", order=order, frequency=frequency)
    # |1 / B|^2 = 1 / (1 + w^2n): 3.01 dB at the crossover whatever the order.
    assert decibels(f.response(frequency)) == pytest.approx([-10 * log10(2)] * 2, abs=1e-9)
    low, high = f.response(HERTZ)
    # 16 poles at 200 Hz: 1e-11 by the rule above; 1e-9 is far below any other crossover's sum
    assert np.abs(low) ** 2 + np.abs(high) ** 2 == pytest.approx(1.0, abs=1e-9)
    if order % 2:
        assert np.abs(decibels(low + high)).max() < 1e-8
    else:
        assert decibels(f.response(frequency).sum()) == pytest.approx(10 * log10(2), abs=1e-8)
        assert np.abs(low + high).min() > 1 - 1e-8


@settings(max_examples=25, deadline=None)
@given(low=st.floats(50.0, 2000.0), ratio=st.floats(1.5, 10.0))
def test_three_ways_add_up_to_an_all_pass(low, ratio):
    f = crossover("linkwitz-riley-3", frequency=[low, low * ratio])
    assert f.outputs == ("low", "mid", "high")
    assert np.abs(decibels(f.response(HERTZ).sum(axis=0))).max() < ROUNDED_DB
    below, above = crossover(order=4, frequency=low), crossover(order=4, frequency=low * ratio)
    wanted = above.response(HERTZ).sum(axis=0) * below.output("low").response(HERTZ)
    assert f.output("low").response(HERTZ) == pytest.approx(wanted, abs=ROUNDED_DB)
    assert f.output("high").response(HERTZ) == pytest.approx(
        below.output("high").response(HERTZ) * above.output("high").response(HERTZ), abs=ROUNDED_DB)


@pytest.mark.parametrize("taps", [3, 31, 65])
def test_the_complementary_pair_adds_up_to_a_delay(taps):
    f = crossover("complementary", taps=taps, frequency=3000.0, window="hann")
    (b_low, _), (b_high, _) = (f.output(name).whole() for name in f.outputs)
    half = len(b_low) // 2
    delayed = [1.0 if k == half else 0.0 for k in range(len(b_low))]
    # 1 - b is rounded once
    assert np.add(b_low, b_high) == pytest.approx(delayed, abs=2.0**-53)
    assert b_low == b_low[::-1] and b_high == b_high[::-1]
    assert not f.is_recursive


# Filters with several outputs


EQUALIZER = design("peak", rate=RATE, frequency=100, gain_db=6, q=1)


def test_what_stands_in_front_is_common_to_all_outputs():
    split = crossover(order=4, frequency=1000)
    f = Filter.cascade([EQUALIZER, EQUALIZER, split])
    assert f.outputs == split.outputs
    assert f.common == Filter.cascade([EQUALIZER, EQUALIZER])
    assert f.response(HERTZ) == pytest.approx(EQUALIZER.response(HERTZ) ** 2 * split.response(HERTZ), rel=1e-13)
    assert f.response(HERTZ).shape == (2, 501)
    for name, response in zip(f.outputs, f.response(HERTZ), strict=True):
        assert f.output(name).response(HERTZ) == pytest.approx(response, rel=1e-13)
    assert f.order == 8 and f.is_recursive and f.unstable_poles() == 0


def test_a_filter_with_one_output_is_as_it_was():
    assert EQUALIZER.outputs == ("y",)
    assert EQUALIZER.output("y") is EQUALIZER and EQUALIZER.common == EQUALIZER
    assert EQUALIZER.response(1000.0).shape == ()


def test_poles_of_all_outputs_are_counted():
    unstable = Filter.from_coefficients([1.0], [1.0, -2.0], rate=RATE)
    assert Filter.split({"low": EQUALIZER, "high": unstable}).unstable_poles() == 1
    assert Filter.cascade([unstable, Filter.split({"low": EQUALIZER, "high": unstable})]).unstable_poles() == 2


def refusal(call):
    with pytest.raises(FilterError) as caught:
        call()
    return str(caught.value)


def test_nothing_follows_a_filter_with_several_outputs():
    assert refusal(lambda: Filter.cascade([crossover(order=4, frequency=1000), EQUALIZER])) == (
        "a filter with the outputs low, high stands before the end of a cascade; nothing may follow a filter with several "
        "outputs. Put it last."
    )


ONE = Filter.from_codes([[1, 0, 0, 0, 0]], "Q2.14", rate=RATE)
SPLITS = {
    "1 outputs are named": {"low": EQUALIZER},
    "an output is named 'Low'": {"Low": EQUALIZER, "high": EQUALIZER},
    "an output is named 'a-b'": {"a-b": EQUALIZER, "high": EQUALIZER},
    'the output "low" has outputs itself, low, high': {"low": crossover(order=2, frequency=99), "high": EQUALIZER},
    'the output "low" is given as codes': {"low": ONE, "high": ONE},
    "the outputs have the rates 44100, 48000 Hz": {"a": EQUALIZER, "b": Filter.from_coefficients([1], rate=44100)},
}


@pytest.mark.parametrize("begin", SPLITS)
def test_outputs_that_cannot_be(begin):
    assert refusal(lambda: Filter.split(SPLITS[begin])).startswith(begin)


@pytest.mark.parametrize("question", ["sections", "whole", "ratio", "zeros_poles"])
def test_what_is_asked_of_one_transfer_function_names_the_outputs(question):
    f = crossover(order=4, frequency=1000)
    assert "outputs low, high" in refusal(getattr(f, question))
    assert 'output("low")' in refusal(getattr(f, question))


def test_an_output_that_is_not_there():
    assert refusal(lambda: EQUALIZER.output("low")) == "there is no output 'low'; outputs are y."


def test_codes_do_not_stand_before_a_crossover():
    assert "given as codes" in refusal(lambda: Filter.cascade([ONE, crossover(order=4, frequency=1000)]))


def test_a_crossover_has_no_numbers_to_be_written_as():
    assert "outputs low, high" in refusal(lambda: preset_text(crossover(order=4, frequency=1000)))


DESIGNS = {
    "order is 3": ("linkwitz-riley", {"order": 3, "frequency": 100}),
    "order is 17": ("butterworth-crossover", {"order": 17, "frequency": 100}),
    "frequency is 24000": ("linkwitz-riley", {"order": 4, "frequency": 24000}),
    "frequency is 100, allowed is a list of two": ("linkwitz-riley-3", {"frequency": 100}),
    "frequency is [200, 100]": ("linkwitz-riley-3", {"frequency": [200, 100]}),
    "taps is 32; only an odd number": ("complementary", {"taps": 32, "frequency": 100, "beta": 5.0}),
    "the poles round to the unit circle": ("linkwitz-riley", {"order": 8, "frequency": 1e-90}),
}


@pytest.mark.parametrize("reason", DESIGNS)
def test_designs_that_cannot_be(reason):
    kind, parameters = DESIGNS[reason]
    assert reason in refusal(lambda: crossover(kind, **parameters))


def test_the_first_order_needs_no_all_pass():
    f = crossover("butterworth-crossover", order=1, frequency=sqrt(2) * 1000)
    assert f.response(HERTZ).sum(axis=0) == pytest.approx(np.ones(len(HERTZ)), abs=1e-13)
