"""The noise figures, on differences that are known."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.signal import lfilter

from streamhost.measure.counting import Counting, stretches
from streamhost.measure.levels import power_dbfs
from streamhost.measure.noise_sum import NoiseSum, noise_of, settling_of_run
from streamhost.measure.welch import segment_lengths

RATE = 48000
FRAMES = 10 * RATE


def white(seed, frames=FRAMES, channels=1):
    return np.random.default_rng(seed).standard_normal((frames, channels))


def no_marks(x):
    return np.zeros(x.shape, np.uint8)


@pytest.mark.parametrize("level", [1e-1, 1e-5, 1e-12])
def test_white_noise_is_read_back(level):
    """Power spreads evenly: the band holds 19,980 of 24,000 Hz."""
    noise = noise_of(level * white(1), RATE)
    assert noise.full_dbfs == pytest.approx(power_dbfs(level**2), abs=0.05)  # scatter of 480,000 frames: 0.009 dB
    assert noise.dbfs == pytest.approx(power_dbfs(level**2 * 19980 / 24000), abs=0.05)
    assert noise.interval_db == pytest.approx(0.0195, rel=0.1)  # 1.96 * 10 lg(e) * root of 2 / (2 * 399,600 * 0.947)


def test_a_tone_outside_the_band_is_not_counted():
    t = np.arange(FRAMES)[:, np.newaxis] / RATE
    rumble, hiss = np.sin(2 * np.pi * 10.0 * t), np.sin(2 * np.pi * 21500.0 * t)
    tone = 1e-4 * np.sin(2 * np.pi * 1000.0 * t)
    noise = noise_of(rumble + hiss + tone, RATE)
    assert noise.dbfs == pytest.approx(-80.0, abs=0.01)  # what the window lets through of two tones 80 dB louder
    assert noise.full_dbfs == pytest.approx(3.01, abs=0.01)
    assert noise.a_dbfs == pytest.approx(-80.0, abs=0.01)  # A is 0 dB at 1 kHz


def test_the_mean_is_told_apart():
    noise = noise_of(1e-6 * white(2) + 0.25, RATE)
    assert noise.mean == pytest.approx(0.25, abs=1e-8)  # 1e-6 over the root of 480,000, five times
    assert noise.full_dbfs == pytest.approx(-117.0, abs=0.05)
    assert noise.dbfs == pytest.approx(power_dbfs(1e-12 * 19980 / 24000), abs=0.05)


def test_channels_are_averaged_in_power():
    x = white(3, channels=2) * [1.0, 0.0]
    alone = noise_of(x[:, :1], RATE)
    both = noise_of(x, RATE)
    assert both.dbfs == pytest.approx(alone.dbfs - 3.0103, abs=1e-4)
    assert both.full_dbfs == pytest.approx(alone.full_dbfs - 3.0103, abs=1e-4)


@pytest.mark.parametrize(("radius", "angle"), [(0.9987, 0.003), (0.99, 0.1), (0.9, 1.0)])
def test_the_interval_holds_the_truth_as_often_as_it_says(radius, angle):
    """Of 60 runs through a resonance 95 % are expected within it; fewer than 50 would come by chance once in 10^4."""
    a = [1.0, -2.0 * radius * np.cos(angle), radius**2]
    w = 2.0 * np.pi * np.linspace(20.0, 20000.0, 2_000_001) / RATE
    z = np.exp(-1j * w)
    power = np.trapezoid(1.0 / np.abs(1.0 + a[1] * z + a[2] * z * z) ** 2, w) / np.pi
    truth = power_dbfs(power)
    held = 0
    for seed in range(60):
        noise = noise_of(lfilter([1.0], a, white(100 + seed, FRAMES // 2), axis=0), RATE, 8000.0)
        held += abs(noise.dbfs - truth) <= noise.interval_db
    assert held >= 50


@given(st.lists(st.integers(0, 3000), min_size=1, max_size=12), st.integers(0, 2**32 - 1))
def test_the_division_into_blocks_changes_nothing_but_rounding(lengths, seed):
    frames = sum(lengths) + 9000
    rng = np.random.default_rng(seed)
    x = rng.standard_normal((frames, 2)) + 1.0
    marks = (rng.random((frames, 2)) < 1e-5).astype(np.uint8)
    whole, parts = NoiseSum(RATE, frames, 2, 100.0), NoiseSum(RATE, frames, 2, 100.0)
    whole.add(x, marks)
    start = 0
    for length in [*lengths, 9000]:
        parts.add(x[start : start + length], marks[start : start + length])
        start += length
    one, other = whole.result(), parts.result()
    assert (one.excluded, one.reason) == (other.excluded, other.reason)
    for name in ("dbfs", "interval_db", "full_dbfs", "a_dbfs", "mean"):
        assert getattr(one, name) == pytest.approx(getattr(other, name), rel=1e-9)  # sums in another order


# What does not count


def counted(marks, settling):
    return Counting(settling).take(np.array(marks, np.uint8)).astype(int).tolist()


def test_frames_count_after_the_settling_time():
    assert counted([0] * 6, 4) == [0, 0, 0, 0, 1, 1]


def test_frames_within_the_settling_time_from_an_overflow_on_do_not_count():
    assert counted([0, 0, 0, 1, 0, 0, 0, 1, 1, 0, 0, 0], 2) == [0, 0, 1, 0, 0, 1, 1, 0, 0, 0, 1, 1]


def test_the_share_counts_only_frames_after_the_settling_time():
    counting = Counting(4)
    counting.take(np.array([1, 0, 0, 0, 0, 0, 1, 0], np.uint8))
    counting.take(np.array([0, 0, 0, 0], np.uint8))
    assert (counting.settled, counting.excluded) == (8, 4)


def test_stretches():
    assert list(stretches(np.array([1, 1, 0, 0, 1, 0, 1], np.bool_))) == [(0, 2), (4, 5), (6, 7)]
    assert list(stretches(np.zeros(0, np.bool_))) == []


@pytest.mark.parametrize(("frames", "settling", "wait"), [(1000, 5.0, 64), (1000, 300.0, 300), (1000, np.inf, 500)])
def test_the_settling_time_is_at_least_64_frames_and_at_most_half_the_run(frames, settling, wait):
    assert settling_of_run(settling, frames) == wait


def test_an_overflow_is_left_out_of_the_noise():
    x = 1e-6 * white(4)
    marks = no_marks(x)
    x[FRAMES // 2 : FRAMES // 2 + 500] += 0.5
    marks[FRAMES // 2] = 1
    sums = NoiseSum(RATE, FRAMES, 1, 1000.0)
    sums.add(x, marks)
    noise = sums.result()
    assert noise.excluded == pytest.approx(1000 / 479000, rel=1e-12)  # float64
    assert noise.full_dbfs == pytest.approx(-116.99, abs=0.05)
    assert noise.dbfs == pytest.approx(power_dbfs(1e-12 * 19980 / 24000), abs=0.05)


def test_a_run_that_is_often_broken_off_is_seen_in_short_segments():
    """A frame in 20,000 overflows and 64 after it do not count: 0.3 %, and no segment of 2.7 s is whole."""
    x = 1e-6 * white(4)
    marks = no_marks(x)
    marks[::20000] = 1
    sums = NoiseSum(RATE, FRAMES, 1, 64.0)
    sums.add(x, marks)
    noise = sums.result()
    assert noise.full_dbfs == pytest.approx(-116.99, abs=0.05)
    assert noise.dbfs == pytest.approx(power_dbfs(1e-12 * 19980 / 24000), abs=0.05)
    assert 0.0195 < noise.interval_db < 0.03


def test_above_one_percent_excluded_there_is_no_figure():
    x = 1e-6 * white(5)
    marks = no_marks(x)
    marks[FRAMES // 4 :: FRAMES // 4] = 1
    sums = NoiseSum(RATE, FRAMES, 1, 2000.0)
    sums.add(x, marks)
    noise = sums.result()
    assert noise.excluded == pytest.approx(6000 / 478000, rel=1e-12)  # float64
    assert noise.dbfs is noise.full_dbfs is noise.a_dbfs is noise.interval_db is noise.mean is None
    assert noise.reason == "1.3 % of the frames lie within the settling time of an overflow, more than 1 %"


@pytest.mark.parametrize("bad", [np.nan, np.inf])
def test_what_is_not_finite_gives_no_figure(bad):
    x = white(6)
    x[1000] = bad
    noise = noise_of(x, RATE)
    assert noise.dbfs is None
    assert "finite" in noise.reason


def test_what_does_not_settle_gives_no_figure():
    noise = noise_of(white(7), RATE, np.inf)
    assert noise.dbfs is noise.full_dbfs is None
    assert "does not settle" in noise.reason


def test_a_run_of_no_length_gives_no_figure():
    assert noise_of(white(8, frames=100), RATE).reason == "the run is too short"


def test_below_the_band_only_the_full_band_is_given():
    noise = noise_of(white(9), 30.0)
    assert noise.dbfs is None
    assert noise.full_dbfs == pytest.approx(3.01, abs=0.05)


def test_silence_has_no_noise():
    noise = noise_of(np.zeros((FRAMES, 1)), RATE)
    assert noise.dbfs == noise.full_dbfs == noise.a_dbfs == -np.inf
    assert noise.interval_db is None


@pytest.mark.parametrize(
    ("frames", "settling", "lengths"),
    [
        (100 * RATE, 64, (131072, 8192)),  # quick noise: 6 Hz a bin would do
        (100 * RATE, 5000, (131072,)),  # slow noise: as fine as it gets
        (4 * RATE, 5000, (48000,)),  # four times into the run
        (5000, 64, (5000,)),  # a short run is one segment
        (60, 64, ()),
    ],
)
def test_segments_are_as_long_as_the_noise_needs_and_the_run_allows(frames, settling, lengths):
    assert segment_lengths(RATE, frames, settling) == lengths
