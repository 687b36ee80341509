"""Measured, the presets that ship are what they say: sound ones meet the limits, naive ones miss them, theory agrees."""

import numpy as np
import pytest

from streamhost.files import read_all
from streamhost.measure import Measurement, limit_band, limit_signal, response, verdicts
from streamhost.measure.rounding.rounding_noise import figures_of
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_preset
from streamhost.shipped import names, resolve

# By the white model's own tests, which know nothing of the prediction.
WHITE = {
    "bass-24-bit", "bass-naive-16-bit", "bass-naive-24-bit-transposed", "bass-naive-boost-first", "bass-naive-wrap",
    "crossover-24-bit", "crossover-double-state", "crossover-naive-16-bit", "hum-double-state",
    "hum-naive-16-bit-state", "hum-naive-24-bit", "level-moving-average", "level-naive-one-pole", "level-one-pole",
    "meter-32-bit", "meter-double-state", "meter-naive-24-bit", "rumble-double-state", "rumble-naive-16-bit-state",
    "rumble-naive-24-bit", "treble-32-bit-sum", "treble-40-bit-sum", "treble-naive-saturating-sum",
}  # fmt: skip
# On the busy noise of the limits, which has headroom and no silence, these are sound.
FAIL_ELSEWHERE = {"bass-naive-boost-first", "bass-naive-wrap", "meter-naive-high-words", "treble-naive-saturating-sum"}
THREE_SIGMA = 3.0 / 1.96
"""Of the half width of a 95 % interval: of some twenty presets one leaves the interval itself by chance."""


def realized(name):
    return realize_preset(load_preset(name))


def recording(name):
    return read_all(resolve(name, "sample"))[0]


LONG = ("level-", "treble-", "equalizer-", "meter-")
"""Presets of many registers or taps, which take a second or more each."""


@pytest.mark.parametrize(
    "name", [pytest.param(name, marks=pytest.mark.slow if name.startswith(LONG) else ()) for name in names("preset")]
)
def test_limits_are_met_or_missed_as_the_name_says_and_theory_agrees(name):
    """On white noise, peak -20 dBFS, seed 1, by which limits are checked."""
    preset = load_preset(name)
    asked = next(load_preset(other).limits for other in names("preset")
                 if other.split("-")[0] == name.split("-")[0] and "naive" not in other)
    realization, band = realize_preset(preset), limit_band(asked, preset.rate)
    x = limit_signal(preset.rate)
    measurement = Measurement(realization, len(x), 1, band)
    for start in range(0, len(x), measurement.block):
        measurement.step(x[start : start + measurement.block])
    found = measurement.result()
    results = {"noise": figures_of(realization, found, measurement), "response": response(realization, [band])}
    judged = verdicts(asked, realization, results.__getitem__)
    missed = found.unstable > 0 or not all(verdict.meets for verdict in judged)
    assert missed == (not preset.limits and name not in FAIL_ELSEWHERE)
    for figures in found.outputs:
        assert figures.white.holds or name not in WHITE
        if figures.white.holds:
            allowed = max(0.5, THREE_SIGMA * figures.noise.interval_db)
            assert figures.noise.dbfs == pytest.approx(figures.prediction.dbfs, abs=allowed)
        if figures.noise.dbfs is None:
            assert figures.white.holds is None
            assert figures.white.reason


def test_a_gain_behind_the_boost_comes_too_late_on_the_drums():
    tallies = {}
    for name in ("bass-24-bit", "bass-naive-boost-first", "bass-naive-wrap"):
        realization = realized(name)
        realization.process(recording("drums"))
        tallies[name] = realization.tally()
    assert tallies["bass-24-bit"].saturations == 0
    assert tallies["bass-naive-boost-first"].saturations > 1000
    assert tallies["bass-naive-wrap"].wraps > 500


def test_a_sum_may_wrap_on_the_way_and_must_not_saturate_there():
    drums = recording("drums")
    exact, wrapping, saturating = (
        realized(f"treble-{name}") for name in ("40-bit-sum", "32-bit-sum", "naive-saturating-sum")
    )
    right = exact.process(drums)
    assert np.array_equal(wrapping.process(drums), right)
    assert wrapping.tally().accumulator_overflows == 0
    wrong = saturating.process(drums)
    assert saturating.tally().accumulator_overflows > 100
    assert np.abs(wrong - right).max() > 0.01


def test_what_a_meter_rests_at_is_told_by_no_noise_figure():
    """Of full scale, half a second after the strings have faded."""
    strings = np.concatenate([recording("plucked"), np.zeros((24000, 2))])
    rests = {
        name: np.abs(realized(f"meter-{name}").process(strings)[-1]).max()
        for name in ("double-state", "32-bit", "float32", "naive-high-words")
    }
    assert rests["double-state"] <= 2**-15
    assert rests["32-bit"] < 2**-15
    assert rests["float32"] < 2**-15
    assert rests["naive-high-words"] > 4 * 2**-15


def test_a_level_of_one_word_sticks_and_one_of_two_falls():
    level = np.abs(recording("speech"))
    assert np.abs(realized("level-one-pole").process(level)[-1]).max() == 0
    assert np.abs(realized("level-moving-average").process(level)[-1]).max() == 0
    # y moves while (x - y) / 480 rounds to a step: it stops 240 steps away.
    assert np.abs(realized("level-naive-one-pole").process(level)[-1]).max() == 240 / 2**15
