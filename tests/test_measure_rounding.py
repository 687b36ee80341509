"""The instrument `noise`: its meters read what is known, and what it predicts is what it measures."""

import numpy as np
import pytest

from streamhost import Filter, Fixed, design, realize
from streamhost.measure import noise, noise_of
from streamhost.measure.levels import power_dbfs
from streamhost.measure.quasi_peak import quasi_peak, quasi_peak_power
from streamhost.measure.rounding.dynamic_range import beside_tone, dynamic_range, tone_hz
from streamhost.measure.weighting import itu_468_weighting
from streamhost.signals import sine, white

RATE = 48000
FINE = "Q2.30"

# Rec. ITU-R BS.468-4, Table 2 (single bursts of 5 kHz, ms) and Table 3 (bursts of 5 ms, so many a second): the lowest
# and the highest reading allowed, over that of the steady tone, in percent. From memory.
SINGLE = {1: (13.5, 21.4), 2: (22.4, 31.6), 5: (34, 46), 10: (41, 55), 20: (44, 60), 50: (50, 68), 100: (58, 78), 200: (68, 92)}
REPEATED = {2: (43, 53), 10: (72, 82), 100: (94, 100)}

# Rec. ITU-R BS.468-4, Table 1: Hz, dB re 1 kHz, tolerance; at 6.3 kHz 0.05 for the digit given
CURVE_468 = {31.5: (-29.9, 2.0), 400: (-7.8, 0.7), 2000: (5.6, 0.5), 6300: (12.2, 0.05), 10000: (8.1, 0.8), 20000: (-22.2, 2.0)}


def tone_5k(seconds):
    return np.sin(2 * np.pi * 5000 / RATE * np.arange(round(seconds * RATE)))


def burst(ms):
    x = np.zeros(RATE // 2)
    x[: ms * RATE // 1000] = tone_5k(ms / 1000)
    return x


def bursts(a_second):
    x = np.zeros(4 * RATE)
    for start in range(0, len(x), RATE // a_second):
        x[start : start + 240] = tone_5k(0.005)
    return x


# Meters on what is known


@pytest.fixture(scope="module")
def steady():
    return quasi_peak(tone_5k(2.0), RATE)


@pytest.mark.parametrize("ms", SINGLE)
def test_the_quasi_peak_meter_reads_single_bursts(ms, steady):
    low, high = SINGLE[ms]
    assert low <= 100 * quasi_peak(burst(ms), RATE) / steady <= high


@pytest.mark.parametrize("a_second", REPEATED)
def test_the_quasi_peak_meter_reads_repeated_bursts(a_second, steady):
    low, high = REPEATED[a_second]
    assert low <= 100 * quasi_peak(bursts(a_second), RATE) / steady <= high


@pytest.mark.parametrize(("hertz", "gain"), [(1000.0, 0.0), (5000.0, 11.7)])
def test_the_quasi_peak_meter_reads_a_steady_tone_as_its_weighted_rms(hertz, gain):
    tone = 0.01 * np.sin(2 * np.pi * hertz / RATE * np.arange(3 * RATE))
    allowed = 0.02 if hertz == 1000.0 else 0.5  # what the instrument is to read; the curve's own tolerance at 5 kHz
    assert power_dbfs(quasi_peak_power(tone, RATE)) == pytest.approx(-40.0 + gain, abs=allowed)


@pytest.mark.parametrize("hertz", CURVE_468)
def test_the_468_curve(hertz):
    wanted, tolerance = CURVE_468[hertz]
    assert 10 * np.log10(itu_468_weighting(hertz)) == pytest.approx(wanted, abs=tolerance)


def test_known_noise_and_a_known_tone_are_read_through_the_468_curve():
    hertz = np.linspace(20.0, 20000.0, 200_001)
    share = np.trapezoid(itu_468_weighting(hertz), hertz) / 24000.0
    heard = noise_of(1e-4 * np.random.default_rng(3).standard_normal((10 * RATE, 1)), RATE)
    assert heard.rms_468_dbfs == pytest.approx(power_dbfs(1e-8 * share), abs=0.05)  # our own bound
    tone = noise_of(1e-3 * np.sin(2 * np.pi * 1000.0 / RATE * np.arange(5 * RATE))[:, None], RATE)
    assert tone.rms_468_dbfs == pytest.approx(-60.0, abs=0.01)


def test_a_tone_is_taken_out_and_nothing_else():
    hiss = 1e-5 * np.random.default_rng(4).standard_normal((RATE, 2))
    left = beside_tone(hiss + sine(RATE, RATE, 997.3, -6.0, 2) + 0.1, RATE, 997.3)
    assert np.abs(left - (hiss - hiss.mean(axis=0))).max() < 1e-6  # the sine's own 24 bits


# The instrument


def gain(signal="Q1.15", **format):
    """One product, by the golden section: its fractions lie evenly. One rounding drops all the bits of a fine coefficient."""
    filter = Filter.from_coefficients([0.6180339887], rate=RATE)
    return realize(filter, form="direct-1", format=Fixed(signal, coefficients=FINE, **format))


@pytest.fixture(scope="module")
def of_gain():
    return noise(gain(rounding="floor"), white(4 * RATE, 1, 1, -20.0), more={"again": white(2 * RATE, 1, 2, -30.0)})


def test_one_rounding_is_predicted_and_measured(of_gain):
    """q^2 / 12 (Bennett 1948), and of it the share of the band; all through each curve."""
    full = power_dbfs(2.0**-30 / 12.0)
    assert of_gain.predicted_full_dbfs == pytest.approx(full, abs=1e-6)
    assert of_gain.measured_full_dbfs == pytest.approx(full, abs=0.05)  # our own bound
    for name in ("", "a_", "468_rms_"):
        measured, predicted = (getattr(of_gain, f"{kind}_{name}dbfs") for kind in ("measured", "predicted"))
        # 4 s through 468, which is a band of some 5 kHz, scatter by 0.03 dB: three times that
        assert measured == pytest.approx(predicted, abs=0.1 if name == "468_rms_" else 0.05), name
    assert of_gain.white_model_holds
    [source] = of_gain.sources
    assert (source.rounding, source.share_percent) == ("the output", pytest.approx(100.0))
    assert source.predicted_dbfs == pytest.approx(of_gain.predicted_dbfs, abs=1e-9)


def test_the_mean_of_a_floor_is_read_within_a_hundredth_of_a_step(of_gain):
    """Two's-complement truncation has a mean of -1/2 step (Oppenheim & Schafer, ch. 6)."""
    assert of_gain.mean_lsb == pytest.approx(-0.5, abs=0.01)


def test_spectra_hold_the_figures(of_gain):
    hertz = of_gain.spectrum_hz
    inside = (hertz >= 20.0) & (hertz <= 20000.0)
    for curve, figure in ((of_gain.measured_spectrum_dbfs, of_gain.measured_dbfs),
                          (of_gain.predicted_spectrum_dbfs, of_gain.predicted_dbfs)):
        power = np.sum(10 ** (curve[inside] / 10)) * (hertz[1] - hertz[0])
        assert 10 * np.log10(power) == pytest.approx(figure, abs=0.01)  # half a bin at each edge


def test_each_signal_has_its_line(of_gain):
    assert [run.signal for run in of_gain.runs] == ["input", "tone", "again"]
    assert all(run.measured_dbfs == pytest.approx(of_gain.predicted_dbfs, abs=0.1) for run in of_gain.runs)
    assert all(run.measured_468_quasi_peak_dbfs > run.measured_468_rms_dbfs for run in of_gain.runs)  # noise has peaks
    assert of_gain.complete


def test_broken_off_it_gives_what_is_done():
    def impatient(share, doing):
        if doing == "tone":
            raise KeyboardInterrupt

    found = noise(gain(), white(RATE, 1, 1, -20.0), report=impatient)
    assert (found.complete, [run.signal for run in found.runs], found.dynamic_ranges) == (False, ["input"], ())


def test_the_roundings_add_up():
    filter = design("peak", rate=RATE, frequency=1000.0, gain_db=6.0, q=1.0)
    found = noise(realize(filter, form="transposed-2", format=Fixed("Q1.15", coefficients=FINE)),
                  white(RATE, 1, 1, -20.0), judged_only=True)
    assert sum(one.share_percent for one in found.sources) == pytest.approx(100.0)
    assert len(found.sources) == 3
    powers = sum(10 ** (one.predicted_dbfs / 10) for one in found.sources)
    assert 10 * np.log10(powers) == pytest.approx(found.predicted_dbfs, abs=1e-9)


# Full-scale sine over the noise of N bits with triangular dither, full band, in dB: 6.02 N + 1.76 - 4.77 (AES17's own
# figures; partly from memory). The instrument's band is 19,980 of 24,000 Hz.
DITHERED = {12: 69.24, 16: 93.32, 20: 117.40}


@pytest.mark.parametrize("bits", DITHERED)
def test_the_dynamic_range_of_a_wire_is_that_of_its_dithered_word(bits):
    wire = realize(Filter.from_coefficients([1.0], rate=RATE), format=Fixed(f"Q1.{bits - 1}", coefficients="Q2.14"))
    found = dynamic_range(wire, 0, "", 2 * RATE, 64)
    band = 10 * np.log10(24000.0 / 19980.0)
    assert found.tone_hz == 997.0
    assert found.dynamic_range_unweighted_db == pytest.approx(DITHERED[bits] + band, abs=0.1)  # 4 sigma of 2 s: 0.08 dB


@pytest.mark.parametrize(("kind", "frequency", "expected"), [("low-pass", 100.0, 100.0), ("high-pass", 5000.0, 5000.0),
                                                            ("notch", 50.0, 997.0)])
def test_the_tone_is_in_the_pass_band(kind, frequency, expected):
    """At the cut-off, 3.01 dB down at q = 1/sqrt 2, or where nothing is cut."""
    realization = realize(design(kind, rate=RATE, frequency=frequency, q=2**-0.5), format="float64")
    assert tone_hz(realization, 0) == pytest.approx(expected, rel=0.01)  # a step of the grid, and 0.01 dB


# Full-scale sine over the error of rounding it to N bits, full band, in dB: 6.02 N + 1.76 (IEC 61606-3:2008 and AES17-2015
# for what 0 dBFS is), within 0.3 dB.
ROUNDED = {8: 49.93, 12: 74.01, 16: 98.09, 20: 122.17, 24: 146.26}


@pytest.mark.parametrize("bits", ROUNDED)
def test_a_rounded_full_scale_sine_is_as_far_above_its_error_as_the_table_says(bits):
    wire = realize(Filter.from_coefficients([1.0], rate=RATE), format=Fixed(f"Q1.{bits - 1}", coefficients="Q2.14"))
    x = (1.0 - 2.0 ** (1 - bits)) * np.sin(2 * np.pi * 997.0 / RATE * np.arange(2 * RATE))[:, np.newaxis]
    assert noise_of(wire.process(x) - x, RATE).full_dbfs == pytest.approx(-ROUNDED[bits], abs=0.3)
