"""A loudness meter on a fixed-point K weighting reads what the standards say, and visibly not on one that is too short.

Rec. ITU-R BS.1770-4, Annex 1: L = -0.691 + 10 lg(sum of the channels' weighted mean squares), gated; a 997 Hz sine of
0 dBFS in one channel reads -3.01. EBU Tech 3341 (v4, 2023), Table 1, cases 1 to 6, and 2.9, within 0.1. As quoted second-hand;
the gates, -70 and -10, are from memory.
"""

import numpy as np
import pytest

from streamhost import Fixed, design, realize

RATE = 48000
BLOCK, HOP = RATE * 400 // 1000, RATE // 10
SURROUND = np.array([1.0, 1.0, 1.0, 1.41, 1.41])
GOOD = {
    "32 bits": Fixed("Q2.30", coefficients={"bits": 32, "point": "coefficient"}),
    "24 bits, state of 48": Fixed("Q2.22", coefficients={"bits": 32, "point": "coefficient"}, state="Q2.46", operand="Q2.46"),
    "float64": "float64",
}
SHORT = Fixed("Q2.14", coefficients={"bits": 16, "point": "coefficient"})
"""What it rounds, the high-pass next to z = 1 makes 63 dB louder: some -30 dBFS, where quiet parts and channels are."""

# Seconds and peak levels in dBFS of a 1 kHz sine, in phase in each channel: left, right, centre, surrounds.
CASES = {
    "1": ([(20.0, -23.0)], 2, -23.0),
    "2": ([(20.0, -33.0)], 2, -33.0),
    "3": ([(10.0, -36.0), (60.0, -23.0), (10.0, -36.0)], 2, -23.0),
    "4": ([(10.0, -72.0), (10.0, -36.0), (60.0, -23.0), (10.0, -36.0), (10.0, -72.0)], 2, -23.0),
    "5": ([(20.0, -26.0), (20.1, -20.0), (20.0, -26.0)], 2, -23.0),
    "6": ([(20.0, [-28.0, -28.0, -24.0, -30.0, -30.0])], 5, -23.0),
    "2.9": ([(5.0, -18.0)], 2, -18.0),
}


@pytest.fixture(scope="module")
def meters():
    weighting = design("k-weighting", rate=RATE)
    formats = {**GOOD, "16 bits": SHORT}
    return {name: realize(weighting, form="direct-1", format=format) for name, format in formats.items()}


def tone(segments, channels, frequency=1000.0):
    levels = np.concatenate([np.broadcast_to(np.asarray(level, float), (round(seconds * RATE), channels))
                             for seconds, level in segments])
    sine = np.sin(2 * np.pi * frequency / RATE * np.arange(len(levels)))
    return sine[:, np.newaxis] * 10.0 ** (levels / 20.0)


def integrated(meter, x):
    """Gated loudness of (frames, channels)."""
    meter.reset()
    power = np.cumsum(np.vstack((np.zeros(x.shape[1]), meter.process(x) ** 2)), axis=0) @ SURROUND[: x.shape[1]]
    starts = np.arange(0, len(x) - BLOCK + 1, HOP)
    blocks = (power[starts + BLOCK] - power[starts]) / BLOCK
    kept = blocks[loudness(blocks) > -70.0]
    return loudness(kept[loudness(kept) > loudness(kept.mean()) - 10.0].mean())


def loudness(power):
    return -0.691 + 10.0 * np.log10(np.maximum(power, 1e-20))


@pytest.mark.parametrize("name", GOOD)
def test_a_full_scale_sine_reads_what_the_standard_says(meters, name):
    x = 0.9999 * tone([(3.0, 0.0)], 1, 997.0)
    assert integrated(meters[name], x) == pytest.approx(-3.01, abs=0.01)


@pytest.mark.parametrize("case", ["1", "2.9", *(pytest.param(case, marks=pytest.mark.slow) for case in "23456")])
@pytest.mark.parametrize("name", GOOD)
def test_the_broadcasters_cases(meters, name, case):
    segments, channels, expected = CASES[case]
    assert integrated(meters[name], tone(segments, channels)) == pytest.approx(expected, abs=0.1)


@pytest.mark.parametrize("case", ["6", pytest.param("4", marks=pytest.mark.slow)])
def test_sixteen_bits_fail_visibly(meters, case):
    segments, channels, expected = CASES[case]
    assert integrated(meters["16 bits"], tone(segments, channels)) > expected + 1.0
