"""Test signals: every value a 24-bit code, the same on every machine, and what they say they are."""

import hashlib
from collections.abc import Callable
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from streamhost import signals
from streamhost.errors import RequestError
from streamhost.signals import dc, impulse, peak_code, random_words, silence, sine, sweep, white

LEVELS = st.floats(-150, 0)
RATES = st.sampled_from([8000, 44100, 48000, 96000, 44099.5])


def codes(samples: np.ndarray) -> np.ndarray:
    scaled = samples * 2**23
    assert np.array_equal(scaled, np.rint(scaled))
    return scaled.astype(np.int64)


def digest(samples: np.ndarray) -> str:
    return hashlib.sha256(codes(samples).astype("<i4").tobytes()).hexdigest()[:16]


@given(st.integers(0, 300), st.integers(1, 3), st.integers(0, 2**64 - 1), LEVELS, RATES, st.data())
def test_every_signal_is_made_of_24_bit_codes_within_its_peak(
    frames: int, channels: int, seed: int, level: float, rate: float, data: st.DataObject
) -> None:
    first, last = (data.draw(st.floats(1e-3, rate * 0.499)) for _ in range(2))
    made = [
        white(frames, channels, seed, level),
        sine(frames, rate, first, level, channels),
        sweep(frames, rate, (first, last), level, channels),
        silence(frames, channels),
        dc(frames, 10 ** (level / 20) / 2, channels),
        *([impulse(frames, level, frames - 1, channels)] if frames else []),
    ]
    for samples in made:
        assert samples.shape == (frames, channels)
        assert samples.dtype == np.float64
        assert not np.signbit(samples[samples == 0]).any()
        assert np.all(np.abs(codes(samples)) <= peak_code(level) + 1)  # dc's own rounding may differ by one code
    for samples in made[1:]:
        assert np.array_equal(samples, np.repeat(samples[:, :1], channels, axis=1))


def test_the_bits_are_the_same_on_every_machine() -> None:
    # Computed once by this program; a machine on which these differ gives other figures than the rest.
    assert digest(white(10000, 2, seed=1, peak_dbfs=0)) == "0635f2aa7a81d25d"
    assert digest(sine(10000, 48000, 997, peak_dbfs=-1)) == "51d087e726a044da"
    assert digest(sweep(10000, 48000, (20, 20000), peak_dbfs=-3)) == "28cf27226e761cbf"


def test_peak_codes() -> None:
    # 2**23 * 10**(level / 20), by hand: 838860.8 and 4194304 * 1.0 (6.0206 dB is a factor of 2 to within 1e-8).
    assert peak_code(-20) == 838861
    assert peak_code(-20 * float(mpmath.log10(2))) == 2**22
    assert peak_code(0) == 2**23 - 1
    assert peak_code(-200) == 0


# Noise


def test_the_generator_gives_the_published_words() -> None:
    # splitmix64 seeded with 1234567, the values usually printed with it: from memory.
    assert random_words(1234567, 5).tolist() == [
        6457827717110365317,
        3203168211198807973,
        9817491932198370423,
        4593380528125082431,
        16408922859458223821,
    ]


@given(st.integers(0, 2**64 - 1), st.integers(1, 20))
def test_the_generator_agrees_with_whole_numbers(seed: int, count: int) -> None:
    expected = []
    state = seed
    for _ in range(count):
        state = (state + 0x9E3779B97F4A7C15) % 2**64
        word = state
        word = (word ^ word >> 30) * 0xBF58476D1CE4E5B9 % 2**64
        word = (word ^ word >> 27) * 0x94D049BB133111EB % 2**64
        expected.append(word ^ word >> 31)
    assert random_words(seed, count).tolist() == expected


def test_noise_of_few_codes_takes_each_alike() -> None:
    level = 20 * np.log10(2 / 2**23)
    samples = codes(white(100000, 1, seed=3, peak_dbfs=level))
    values, counts = np.unique(samples, return_counts=True)
    assert values.tolist() == [-2, -1, 0, 1, 2]
    # Binomial: standard deviation sqrt(1e5 * 0.2 * 0.8) = 126; five of them.
    assert np.all(np.abs(counts - 20000) < 5 * 126)


def test_noise_is_uniform_white_and_independent_between_channels() -> None:
    n = 2**18
    samples = white(n, 2, seed=5, peak_dbfs=-6)
    peak = peak_code(-6) / 2**23
    # Five standard deviations of each estimate, of independent values uniform between -peak and peak.
    assert np.all(np.abs(samples.mean(axis=0)) < 5 * peak / np.sqrt(3 * n))
    power = (samples**2).mean(axis=0) / peak**2
    assert np.all(np.abs(power - 1 / 3) < 5 * np.sqrt(4 / 45 / n))
    left, right = samples.T / (peak / np.sqrt(3))
    for first, second in ((left, right), (left[1:], left[:-1]), (left[2:], left[:-2]), (left[1:], right[:-1])):
        assert abs(float(np.mean(first * second))) < 5 / np.sqrt(n)


def test_noise_begins_alike_whatever_its_length_and_channels() -> None:
    long = white(1000, 3, seed=9, peak_dbfs=-10)
    assert np.array_equal(white(100, 3, 9, -10), long[:100])
    assert np.array_equal(white(1000, 1, 9, -10), long[:, :1])
    assert not np.array_equal(white(1000, 1, 10, -10), long[:, :1])
    assert len(np.unique(long[:5])) == 15


# Tones


@pytest.mark.parametrize(("rate", "frequency"), [(48000, 997), (44100, 20.5), (48000, 12000), (96000, 47999)])
def test_a_sine_is_the_rounded_sine(rate: float, frequency: float) -> None:
    samples = codes(sine(500, rate, frequency, peak_dbfs=-0.5))[:, 0]
    with mpmath.workdps(40):
        peak = peak_code(-0.5)
        exact = [peak * mpmath.sin(2 * mpmath.pi * n * mpmath.mpf(frequency) / rate) for n in range(500)]
        assert samples.tolist() == [int(mpmath.nint(value)) for value in exact]


def test_a_sine_stays_in_phase_for_an_hour() -> None:
    # 1000 Hz at 48 kHz repeats every 48 frames. At a peak of 2**22 no value lies near a tie of the rounding, which the
    # phase's drift could tip: in an hour it is at most 1.7e8 * 2**-65 turns, 1.3e-4 of a code.
    hour = 48000 * 3600
    peak = -20 * float(mpmath.log10(2))
    step = round(Fraction(1000, 48000) * 2**64)
    late = np.array([n * step % 2**64 for n in range(hour - 48, hour)], dtype=np.uint64)
    assert np.array_equal(signals._from_phase(late, peak, 1), sine(48, 48000, 1000, peak))


def test_a_full_scale_sine_reads_0_dbfs() -> None:
    samples = sine(48000, 48000, 1000, 0)
    level = 10 * np.log10(np.mean(samples**2)) + 10 * np.log10(2)
    # The peak is one code short: 20 log10(1 - 2**-23) = -1.04e-6 dB. Rounding moves the 48 values that repeat by half
    # a code at most: mean |x| / mean x**2 = 1.27 times 2**-24, in dB 8.69 times that, 6.6e-7.
    assert level == pytest.approx(-1.04e-6, abs=6.6e-7)


def test_a_sweep_passes_its_frequencies_in_equal_ratios() -> None:
    frames, rate = 96001, 48000
    samples = sweep(frames, rate, (100, 6400), 0)[:, 0]
    rising = np.flatnonzero((samples[:-1] < 0) & (samples[1:] >= 0))
    crossing = rising - samples[rising] / (samples[rising + 1] - samples[rising])
    middle = (crossing[1:] + crossing[:-1]) / 2
    measured = rate / np.diff(crossing)
    expected = 100 * 64 ** (middle / (frames - 1))
    # A straight line between two samples misses a crossing by up to 0.016 w**2 frames, w = 2 pi f / rate: at 6400 Hz
    # twice 0.0113 in a period of 7.5 frames, at 0.6 of the way (1213 Hz) twice 0.0004 in 39.6. A period's frequency
    # differs from that at its middle by (ratio in a period)**2 / 24: at 100 Hz 1.8e-5.
    wrong = np.abs(measured / expected - 1)
    assert np.max(wrong) < 0.0031
    assert np.max(wrong[middle < frames * 0.6]) < 4e-5
    assert codes(sweep(1, rate, (100, 6400), 0)).tolist() == [[0]]


def test_a_sweep_between_equal_frequencies_is_a_sine() -> None:
    # One step of phase is rounded to 53 bits in the sweep: over 1000 frames 1e-13 of a turn, far below one code.
    assert np.max(np.abs(codes(sweep(1000, 48000, (440, 440), -1)) - codes(sine(1000, 48000, 440, -1)))) <= 1
    down = sweep(1000, 48000, (5000, 50), -1)
    assert np.count_nonzero(np.diff(np.sign(down[:500, 0]))) > 5 * np.count_nonzero(np.diff(np.sign(down[500:, 0])))


# The rest


def test_impulse_constant_and_silence() -> None:
    assert codes(impulse(4, at=2, channels=2)).tolist() == [[0, 0], [0, 0], [2**23 - 1] * 2, [0, 0]]
    assert codes(impulse(2, -20)).tolist() == [[838861], [0]]
    assert codes(dc(2, -1.0)).tolist() == [[-(2**23)]] * 2
    assert codes(dc(1, 1.0)).tolist() == [[2**23 - 1]]
    assert codes(dc(1, 0.25, channels=2)).tolist() == [[2**21, 2**21]]
    assert codes(silence(2, 2)).tolist() == [[0, 0], [0, 0]]


@pytest.mark.parametrize(
    ("make", "reason"),
    [
        (lambda: silence(-1), "frames = -1"),
        (lambda: silence(1, 0), "channels = 0"),
        (lambda: white(1, 0, 1, 0), "channels = 0"),
        (lambda: white(1, 1, -1, 0), "seed = -1"),
        (lambda: white(1, 1, 2**64, 0), "seed = 18446744073709551616"),
        (lambda: white(1, 1, 1, 0.1), "peak_dbfs = 0.1: a peak is at most 0 dBFS"),
        (lambda: sine(1, 48000, 1000, float("nan")), "peak_dbfs = nan"),
        (lambda: sine(1, 48000, 24000, 0), r"frequency = 24000: allowed is above 0 and below .* 24000\.0 Hz"),
        (lambda: sine(1, 48000, 0, 0), "frequency = 0"),
        (lambda: sine(1, 48000, float("nan"), 0), "frequency = nan"),
        (lambda: sine(1, 0, 1000, 0), "rate = 0"),
        (lambda: sweep(1, 48000, (20, 30000), 0), "frequencies = 30000"),
        (lambda: dc(1, 1.1), r"level = 1\.1"),
        (lambda: dc(1, float("nan")), "level = nan"),
        (lambda: impulse(4, at=4), "at = 4: the impulse is at a frame from 0 to 3"),
        (lambda: impulse(0), "frames = 0"),
    ],
)
def test_what_cannot_be_is_refused(make: Callable[[], object], reason: str) -> None:
    with pytest.raises(RequestError, match=reason):
        make()
