"""The verdict on the white model, from residues alone."""

from itertools import pairwise

import numpy as np
import pytest

from streamhost import Filter, Fixed, design, realize
from streamhost.measure import measure
from streamhost.measure.bands import bin_shares
from streamhost.measure.residues import BINS, HANN_SHARE, LAGS, OCTAVES, OctaveSum, ResidueSum, octave_edges, octave_powers
from streamhost.measure.whiteness import Expected, judged
from streamhost.signals import dc, silence, sine, white

RATE = 48000
BAND = (20.0, 20000.0)
FRAMES = 4 * RATE


def peaking(**format):
    filter = design("peak", rate=RATE, frequency=3000.0, gain_db=6.0, q=2.0)
    return realize(filter, form="direct-1", format=Fixed("Q1.15", **{"coefficients": "Q3.29", **format}))


def verdict(x, realization=None):
    return measure(realization or peaking(), x, BAND).white


def busy(peak_dbfs=-20.0, channels=1):
    return white(FRAMES, channels, 3, peak_dbfs)


# Where it holds


@pytest.mark.parametrize("rounding", ["half-up", "half-even", "half-away", "floor"])
def test_a_busy_signal_obeys_it(rounding):
    found = verdict(busy(), peaking(rounding=rounding))
    assert found.holds is True, found.reason


@pytest.mark.parametrize("form", ["direct-1", "direct-2", "direct-1-swapped", "transposed-1", "transposed-2"])
def test_a_busy_signal_obeys_it_in_every_form(form):
    filter = design("low-shelf", rate=RATE, frequency=3000.0, gain_db=6.0, q=0.8)
    realization = realize(filter, form=form, format=Fixed("Q1.15", coefficients="Q3.29"))
    found = verdict(busy(-24.0, channels=2), realization)
    assert found.holds is True, found.reason


def test_dither_makes_a_quiet_tone_obey_it():
    tone = sine(FRAMES, RATE, 997.0, -84.0)
    assert verdict(tone, peaking(dither="tpdf")).holds is True


# Where it does not


@pytest.mark.parametrize(
    "x",
    [silence(FRAMES), dc(FRAMES, 0.1), sine(FRAMES, RATE, 1000.0, -84.0), sine(FRAMES, RATE, 100.0, -60.0)],
    ids=["silence", "a constant", "two steps of a tone", "a slow tone"],
)
def test_a_signal_that_is_not_busy_breaks_it(x):
    found = verdict(x)
    assert found.holds is False
    assert found.reason


def test_rounding_toward_zero_follows_the_signal():
    found = verdict(busy(), peaking(rounding="toward-zero"))
    assert found.holds is False
    assert "toward zero" in found.reason


def test_two_roundings_of_one_value_by_one_coefficient_are_correlated():
    """A peaking filter has a1 = b1, and in transposed-1 both multiply v: what s1 drops, t1 drops with the other sign."""
    filter = design("peak", rate=RATE, frequency=3000.0, gain_db=6.0, q=2.0)
    found = verdict(busy(-40.0), realize(filter, form="transposed-1", format=Fixed("Q1.15", coefficients="Q3.29")))
    assert found.holds is False
    assert "s1" in found.reason
    assert "t1" in found.reason


def test_a_limit_cycle_is_no_noise():
    """y = round(-0.97 y1): in the dead band of L. Jackson (1969) the output alternates for ever."""
    filter = Filter.from_coefficients([1.0], [1.0, 0.97], rate=RATE)
    realization = realize(filter, form="direct-1", format=Fixed("Q1.15", coefficients="Q2.14"))
    x = silence(FRAMES)
    x[:100] = white(100, 1, 1, -40.0)
    measured = measure(realization, x, BAND)
    assert measured.tally.saturations == 0
    assert measured.noise.full_dbfs > -70.0  # the dead band reaches to 0.5 / (1 - 0.97) = 16 steps: -63 dBFS
    assert measured.white.holds is False


def test_busy_half_of_the_time_is_not_enough():
    x = busy()
    x[FRAMES // 2 :] = 0.0
    assert verdict(x).holds is False


# Where it cannot be told


def test_floating_point_has_no_such_model():
    assert verdict(busy(), realize(peaking().filter, format="float32")).holds is None


def test_errors_that_nobody_wrote_down_are_not_judged():
    found = verdict(busy(), peaking(product=17))
    assert found.holds is None
    assert "inside sums" in found.reason


def test_errors_that_nobody_wrote_down_and_nobody_hears_do_not_hinder():
    """Five products are floored to five bits more than the sum: 5 / 4^5 of the noise, 0.02 dB."""
    assert verdict(busy(), peaking(product=20)).holds is True


def test_a_short_run_is_not_judged():
    assert verdict(busy()[:2000]).holds is None


def test_nothing_rounded_is_nothing_to_judge():
    unity = Filter.from_coefficients([0.5, 0.5], rate=RATE)
    realization = realize(unity, form="direct-1", format=Fixed("Q1.31", input="Q1.15", coefficients="Q1.15"))
    assert verdict(busy(), realization).reason == "nothing is rounded"


# The checks one by one, on residues that are made

UNIFORM = Expected("e", 0.0, 1.0 / 12.0, -0.5, dithered=False)
BLOCK = 1 << 15


def residues_of(blocks, x=None):
    total = ResidueSum(np.full(blocks[0].shape[1], -0.5), BLOCK)
    rng = np.random.default_rng(99)
    for k, block in enumerate(blocks):
        total.add(rng.standard_normal(len(block)) if x is None else x[k], block)
    return total.result()


def uniform(seed, count=8, columns=1):
    return list(np.random.default_rng(seed).random((count, BLOCK, columns)) - 0.5)


def reason_of(blocks, expected=(UNIFORM,), x=None):
    found = judged(expected, residues_of(blocks, x))
    assert found.holds is (found.reason == "")
    return found.reason


def test_what_the_sums_say():
    blocks = uniform(1, columns=2)
    residues = residues_of(blocks)
    together = np.concatenate(blocks)
    assert residues.frames == 8 * BLOCK
    assert residues.mean == pytest.approx(together.mean(axis=0), abs=1e-12)  # float64
    assert residues.variance == pytest.approx(together.var(axis=0), rel=1e-9)
    assert residues.histogram.shape == (2, BINS)
    assert residues.histogram.sum(axis=1) == pytest.approx(1.0, rel=1e-12)
    assert residues.correlation.shape == (LAGS + 1, 2, 2)
    assert residues.correlation[0, 0, 0] == pytest.approx(1.0, rel=1e-6)  # products are in single precision
    shifted = np.corrcoef(together[5:, 0], together[:-5, 1])[0, 1]
    assert residues.correlation[5, 1, 0] == pytest.approx(shifted, abs=2e-4)  # 8 frames of a block less, each by 1 / 2^18


def test_false_alarms_are_as_rare_as_said():
    """One in a hundred is allowed; more than three of fifty would come by chance once in 600 times."""
    alarms = sum(bool(reason_of(uniform(seed, count=4, columns=3), (UNIFORM,) * 3)) for seed in range(50))
    assert alarms <= 3


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (lambda e: e + 0.02, "in the mean"),
        (lambda e: 0.96 * e, "variance"),
        (lambda e: np.sign(e) * 12**-0.5, "not uniform"),
        (lambda e: np.where(np.abs(e) < 0.48, e, -e) + 0.0 * e, ""),
        (lambda e: np.sqrt(0.5) * (e + np.roll(e, 3, axis=0)), "not white"),
    ],
    ids=["mean", "variance", "two values", "sign of the rarest", "sum of two"],
)
def test_values_that_do_not_fit(change, said):
    assert said in (reason := reason_of([change(block) for block in uniform(2)]))
    assert bool(said) == bool(reason)


def test_a_drift_is_found():
    blocks = [block + 0.009 * (-1) ** k for k, block in enumerate(uniform(3))]
    assert "drifts" in reason_of(blocks)


def test_a_hidden_tone_is_found():
    """A tenth of the power at one frequency, values still all but uniform."""
    tone = np.sin(2 * np.pi * 40.0 / RATE * np.arange(BLOCK))[:, np.newaxis]
    blocks = [(block + 0.12 * tone + 0.5) % 1.0 - 0.5 for block in uniform(4)]
    assert reason_of(blocks) == ""  # wrapping a uniform value leaves it uniform and white
    blocks = [0.95 * block + 0.127 * tone for block in uniform(4)]
    assert "not white" in reason_of(blocks)


def test_repetition_is_found():
    repeated = np.arange(BLOCK)[:, np.newaxis] % 16 == 5
    blocks = [np.where(repeated, np.roll(block, 5, axis=0), block) for block in uniform(5)]
    assert "5 frames before" in reason_of(blocks)


def test_two_roundings_that_agree_are_found():
    shared = np.arange(BLOCK) % 10 == 0
    blocks = [np.column_stack((e, np.where(shared, e[:, 0], np.roll(e[:, 0], 999)))) for e in uniform(6)]
    assert "drop is correlated" in reason_of(blocks, (UNIFORM, UNIFORM))


def test_many_roundings_are_judged_in_groups():
    """300 are held against each other as 64 sums: each of the 150 pairs that agree makes a part of a correlation."""
    blocks = uniform(9, count=1, columns=300)
    assert reason_of(blocks, (UNIFORM,) * 300) == ""
    mirrored = [np.concatenate((e[:, :150], e[:, 149::-1]), axis=1) for e in blocks]
    assert "others" in (reason := reason_of(mirrored, (UNIFORM,) * 300))
    assert reason.endswith("drop is correlated")


def test_the_last_frames_count_as_all_others_do():
    """Less than a block at the end, where what is dropped stands still: a signal has faded away."""
    blocks = uniform(10, count=9)
    assert reason_of(blocks) == ""
    blocks[-1] = np.full((BLOCK // 2 + 77, 1), -0.37)
    assert "in the mean" in reason_of(blocks)


def test_octaves_are_parted_as_a_meter_parts_bins():
    power = np.random.default_rng(11).random((2, 1025))
    edges = octave_edges(1025)
    expected = [power @ bin_shares(1025, 1.0, (low, high)) for low, high in pairwise(edges.tolist())]
    assert octave_powers(power) == pytest.approx(np.array(expected), rel=1e-12)


def test_a_line_at_the_end_is_seen_between_segments():
    """Half a segment behind the last whole one is in the spectrum too."""
    total = OctaveSum(1, 1024)
    tone = np.sin(2 * np.pi * np.arange(600) * 0.1).astype(np.float32)
    total.add(np.concatenate((np.zeros(2048, np.float32), tone))[:, None], 0)
    octaves, degrees = total.result()
    assert int(np.argmax(octaves[:, 0])) == OCTAVES - 3  # 0.1 of the rate lies in 1/16 to 1/8 of it
    assert degrees[-1] == pytest.approx(5 * 512 * HANN_SHARE)  # four starts and the last, half the bins, twice


def test_what_follows_the_input_is_found():
    blocks = uniform(7)
    x = [block[:, 0] + np.random.default_rng(8).standard_normal(BLOCK) for block in blocks]
    assert "follows the input" in reason_of(blocks, x=x)
