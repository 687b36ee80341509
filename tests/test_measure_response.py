"""How far coefficient rounding moves a response."""

import numpy as np
import pytest

from streamhost import Filter, Fixed, design, realize
from streamhost.measure import response_deviation
from streamhost.measure.sameness import different

RATE = 48000
BAND = (20.0, 20000.0)


def test_float64_moves_nothing():
    filter = design("butterworth", rate=RATE, response="low-pass", order=8, frequency=200.0)
    found = response_deviation(realize(filter, form="transposed-2", format="float64"), BAND)
    assert found.db < 1e-8  # sections rounded to float64, poles 0.003 from the circle


def test_a_gain_off_by_a_known_amount():
    """0.3 in Q1.7 is stored as 38/128."""
    filter = Filter.from_coefficients([0.3], rate=RATE)
    realization = realize(filter, form="direct-1", format=Fixed("Q1.15", coefficients="Q1.7"))
    found = response_deviation(realization, BAND)
    assert found.db == pytest.approx(20.0 * np.log10(0.3 / (38.0 / 128.0)), rel=1e-9)  # float64
    assert found.leak_db is None


@pytest.mark.parametrize("bits", [12, 14, 16, 18])
def test_a_resonance_that_moved_is_found_where_it_is(bits):
    """Against a plain search on two million points of the two transfer functions."""
    filter = design("peak", rate=RATE, frequency=1000.0, gain_db=12.0, q=30.0)
    realization = realize(filter, form="direct-1", format=Fixed("Q1.15", coefficients=f"Q2.{bits}"))
    hertz = np.linspace(900.0, 1100.0, 2_000_001)
    values = {slot.label.split(".")[0]: value for slot, value in
              zip(realization.program.diagram.slots, realization.program.diagram.values[:, 0], strict=True)}
    z = np.exp(-2j * np.pi * hertz / RATE)
    rounded = (sum(values[f"b{k}"] * z**k for k in range(3))
               / (1.0 + sum(values[f"a{k}"] * z**k for k in (1, 2))))
    db = np.abs(20.0 * np.log10(np.abs(rounded / filter.response(hertz))))
    found = response_deviation(realization, BAND)
    assert found.db == pytest.approx(db.max(), rel=1e-6)  # steps of 1e-4 Hz on a peak that is 33 Hz wide
    assert found.hz == pytest.approx(hertz[db.argmax()], abs=0.01)


def test_only_what_lies_within_40_db_is_judged():
    """A notch at 1 kHz that rounding moved: no depth of it counts, and the leak tells what is left."""
    filter = design("notch", rate=RATE, frequency=1000.0, q=0.7)
    realization = realize(filter, form="direct-1", format=Fixed("Q1.15", coefficients="Q2.12"))
    found = response_deviation(realization, BAND)
    assert 0.0 < found.db < 6.0
    assert -80.0 < found.leak_db < -38.0
    high = filter.response([found.hz])
    assert np.abs(high[0]) > 0.01 * 0.999


def test_the_band_is_kept():
    filter = design("high-pass", rate=RATE, frequency=28.0, q=0.707)
    realization = realize(filter, form="direct-1", format="24x24+56")
    wide, narrow = response_deviation(realization, BAND), response_deviation(realization, (1000.0, 2000.0))
    assert wide.hz == 20.0
    assert 1000.0 <= narrow.hz <= 2000.0
    assert narrow.db < wide.db


def test_an_unstable_rounding_has_no_response():
    """1 + a1 + a2 rounds to 0 with 14 fraction bits: a pole on z = 1."""
    filter = design("high-pass", rate=RATE, frequency=28.0, q=0.707)
    realization = realize(filter, form="direct-1", format="16x16+40")
    found = response_deviation(realization, BAND)
    assert realization.unstable == 1
    assert found.db is found.hz is found.leak_db is None
    assert "not stable" in found.reason


def test_nothing_asked_for_is_nothing_to_compare_with():
    realization = realize(Filter.from_coefficients([0.0], rate=RATE), form="direct-1", format="float64")
    assert "no response in the band" in response_deviation(realization, BAND).reason


# One filter or several


def test_one_filter_in_several_descriptions_is_one():
    filter = design("peak", rate=RATE, frequency=1000.0, gain_db=6.0, q=0.707)
    b, a = filter.whole()
    solved = filter.zeros_poles()
    zeros_poles = Filter.from_zeros_poles(solved.zeros, solved.poles, solved.gain, rate=RATE)
    assert different([[filter], [Filter.from_coefficients(b, a, rate=RATE)], [zeros_poles]]) == []


def test_another_filter_is_found_out():
    filters = [design("peak", rate=RATE, frequency=1000.0, gain_db=6.0, q=q) for q in (0.707, 0.707, 0.70701, 0.707)]
    assert different([[filter] for filter in filters]) == [2]
