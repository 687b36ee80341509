"""Levels and weighting, against the standards' definitions and tables."""

from math import inf

import numpy as np
import pytest

from streamhost import Filter, Fixed, realize
from streamhost.files import quantize
from streamhost.measure import measure, noise_of
from streamhost.measure.bands import audio_band, bin_shares
from streamhost.measure.levels import peak_dbfs, power_dbfs
from streamhost.measure.weighting import a_weighting
from streamhost.signals import sine

RATE = 48000

# IEC 61672-1:2013, Table 3, as quoted: band number n with exact frequency 1000 * 10^(0.1 (n - 30)) Hz, A in dB.
A_TABLE = {
    10: -70.4, 11: -63.4, 12: -56.7, 13: -50.5, 14: -44.7, 15: -39.4, 16: -34.6, 17: -30.2, 18: -26.2, 19: -22.5,
    20: -19.1, 21: -16.1, 22: -13.4, 23: -10.9, 24: -8.6, 25: -6.6, 26: -4.8, 27: -3.2, 28: -1.9, 29: -0.8, 30: 0.0,
    31: 0.6, 32: 1.0, 33: 1.2, 34: 1.3, 35: 1.2, 36: 1.0, 37: 0.5, 38: -0.1, 39: -1.1, 40: -2.5, 41: -4.3, 42: -6.6,
    43: -9.3,
}

# 6.02 N + 1.76 dB and 4.77 dB less with triangular dither (Oppenheim & Schafer, ch. 6; S. P. Lipshitz et al., JAES 40,
# 1992): full-scale sine over full-band noise in dB, by bits.
SNR_PLAIN = {8: 49.93, 12: 74.01, 16: 98.09, 20: 122.17, 24: 146.26}
SNR_TPDF = {8: 45.15, 12: 69.24, 16: 93.32}


def full_scale_sine(frames):
    """997 Hz, amplitude 1, in float64."""
    return np.sin(2.0 * np.pi * 997.0 / RATE * np.arange(frames))[:, np.newaxis]


def test_a_full_scale_sine_reads_0_dbfs():
    """AES17-2015, 3.12.1 and IEC 61606-3:2008, 3.4."""
    noise = noise_of(full_scale_sine(64 + RATE), RATE)  # 64 frames to settle, then whole periods
    assert noise.full_dbfs == pytest.approx(0.0, abs=1e-9)  # float64
    assert noise.dbfs == pytest.approx(0.0, abs=1e-6)  # what a Hann window spills beyond 20 kHz
    assert peak_dbfs(1.0) == 0.0


def test_a_full_scale_square_reads_3_01_db_more():
    """The same standards: 0 dBFS lies 3.0103 dB below the level of a full-scale square."""
    assert power_dbfs(1.0) == pytest.approx(3.0103, abs=5e-5)  # the digits given


def test_silence_is_minus_infinity():
    assert power_dbfs(0.0) == peak_dbfs(0.0) == -inf


@pytest.mark.parametrize("bits", SNR_PLAIN)
def test_rounding_a_full_scale_sine(bits):
    exact = full_scale_sine(4 * RATE) * (1.0 - 2.0 ** (1 - bits))  # the largest code
    codes, _ = quantize(exact, bits)
    noise = noise_of(codes / 2.0 ** (bits - 1) - exact, RATE)
    assert noise.full_dbfs == pytest.approx(-SNR_PLAIN[bits], abs=0.3)  # the table's own tolerance


@pytest.mark.parametrize("bits", SNR_TPDF)
def test_rounding_a_sine_with_dither(bits):
    unity = Filter.from_coefficients([1.0], rate=RATE)
    format = Fixed(f"Q1.{bits - 1}", input="Q1.23", operand="Q1.23", dither="tpdf")
    realization = realize(unity, form="direct-1", format=format)
    noise = measure(realization, sine(2 * RATE, RATE, 997.0, -1.0), (20.0, 20000.0)).noise
    assert noise.full_dbfs == pytest.approx(-SNR_TPDF[bits], abs=0.3)  # the table's own tolerance


@pytest.mark.parametrize("band", A_TABLE)
def test_a_weighting_meets_the_table(band):
    frequency = 1000.0 * 10.0 ** (0.1 * (band - 30))
    # the table is rounded to 0.1 dB
    assert 10.0 * np.log10(a_weighting(frequency)) == pytest.approx(A_TABLE[band], abs=0.05)


def test_a_weighting_lets_no_constant_through():
    assert a_weighting([0.0, 1000.0]).tolist() == [0.0, 1.0]


@pytest.mark.parametrize(("rate", "band"), [(48000, (20.0, 20000.0)), (32000, (20.0, 16000.0)), (40, None), (30, None)])
def test_the_band_ends_at_half_the_rate(rate, band):
    assert audio_band(rate) == band


def test_shares_of_bins_add_up_to_the_band():
    shares = bin_shares(101, 10.0, (22.0, 999.0))
    widths = np.array([5.0, *[10.0] * 99, 5.0])
    assert shares @ widths == pytest.approx(977.0, rel=1e-12)  # float64
    assert shares[0] == shares[1] == 0.0
    assert shares[2] == pytest.approx(0.3, rel=1e-12)  # 22 to 25 of 15 to 25
    assert shares[100] == pytest.approx(0.8, rel=1e-12)  # 995 to 999 of 995 to 1000
