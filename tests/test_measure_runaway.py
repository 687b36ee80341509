"""What grows without end, slowly: every block still finite, and nothing to be said of its noise."""

import numpy as np
import pytest

from streamhost import Filter, Fixed, realize
from streamhost.measure import measure
from streamhost.measure.levels import LARGEST, has_run_away
from streamhost.measure.noise_sum import noise_of
from streamhost.signals import white

RATE = 48000
BAND = (20.0, 20000.0)


def growing(denominator, format="float64"):
    """A filter that is unstable as asked."""
    filter = Filter.from_coefficients([1.0], denominator, rate=RATE)
    return realize(filter, form="transposed-2", decomposition="whole", format=format, allow_unstable=True)


@pytest.mark.parametrize("top", [2.0 * LARGEST, 1e155, 1e200, 1.7e308])
def test_a_difference_whose_squares_would_overflow_has_no_noise(top):
    """Blocks' means above 1e154: their squares are beyond float64. A warning would fail the test."""
    noise = noise_of(np.geomspace(1.0, top, 20000)[:, np.newaxis], RATE)
    assert noise.dbfs is noise.full_dbfs is noise.mean is None
    assert "runs away" in noise.reason


def test_the_loudest_that_a_file_holds_still_has_a_figure():
    noise = noise_of(LARGEST * np.sin(np.arange(20000.0))[:, np.newaxis], RATE)
    # 20 lg of 3.4028e38 is 770.64 dB; a sine that begins anywhere has its power up to one part in 20,000
    assert noise.full_dbfs == pytest.approx(770.64, abs=0.01)


@pytest.mark.parametrize("frames", [4000, 10000])
@pytest.mark.parametrize("format", ["float64", "float32"])
def test_a_slow_runaway_is_told_and_nothing_else_is(format, frames):
    """1.05^10000 is 10^211.9: the output of float64 is finite to the end."""
    found = measure(growing([1.0, -1.05], format), white(frames, 1, 5, -20.0), BAND)
    assert found.unstable == 1
    assert "runs away" in found.noise.reason
    assert found.prediction is found.difference_gain_db is found.dc_lsb is found.white.holds is None


def test_what_saturates_while_its_ideal_runs_away_has_no_difference_to_hear():
    found = measure(growing([1.0, -1.05], Fixed("Q1.15", coefficients="Q2.14")), white(10000, 1, 5, -20.0), BAND)
    assert found.tally.saturations > 0
    assert found.difference_gain_db is None
    assert found.white.holds is None
    assert "not stable" in found.white.reason


def test_a_pole_on_the_circle_leaves_a_difference_but_no_verdict():
    found = measure(growing([1.0, -1.0], Fixed("Q1.15", coefficients="Q2.14")), white(10000, 1, 5, -40.0), BAND)
    assert found.noise.dbfs is found.white.holds is None
    assert found.noise.reason
    assert found.white.reason


def test_overflow_everywhere_leaves_no_verdict():
    filter = Filter.from_coefficients([1.0], [1.0, -0.99], rate=RATE)
    found = measure(realize(filter, form="direct-1", format="16x16+40"), white(RATE, 1, 5, 0.0), BAND)
    assert found.unstable == 0
    assert found.noise.dbfs is found.white.holds is None
    assert found.white.reason == "there is no noise figure"


@pytest.mark.parametrize(("samples", "away"), [
    ([0.0, -LARGEST], False), ([LARGEST * (1.0 + 2.0**-52)], True), ([-np.inf], True), ([np.nan, 0.0], True),
])
def test_what_has_run_away(samples, away):
    assert has_run_away(np.array(samples)) is away
