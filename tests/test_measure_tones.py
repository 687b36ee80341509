"""The instrument `tone`: what is put into a signal is read back, and known roundings read as the handbooks say."""

from itertools import count
from math import exp, inf, log10

import numpy as np
import pytest

from streamhost import Filter, Fixed, load_preset, realize
from streamhost.commands.documents import document_of
from streamhost.commands.instruments import limit_verdicts
from streamhost.commands.main import main
from streamhost.commands.measuring.tone import lines as told
from streamhost.measure import tone
from streamhost.measure.deviation import Responses
from streamhost.measure.tones.coherent import tone_bins, window_frames
from streamhost.measure.tones.lines import Spectra
from streamhost.measure.tones.periodogram import alarm, noise_floor, periodogram
from streamhost.measure.tones.setting import setting_of
from streamhost.presets.realizing import realize_preset
from streamhost.signals import level, triangular, turning, white

RATE = 48000
WINDOW = window_frames(RATE, quick=False)
QUICK = window_frames(RATE, quick=True)
BIN = 1051  # 996.5 Hz, no multiple of 3 or 5


def tone_of(bin, dbfs, window=WINDOW):
    return level(dbfs) * turning(window, bin, window)


def line_of(bins, dbfs, window=WINDOW):
    """Anywhere between bins."""
    return level(dbfs) * np.sin(2 * np.pi * bins * np.arange(window) / window + 1.0)


def hiss(dbfs, window=WINDOW, seed=7):
    """White, of that level from 0 to half the rate: uniform noise lies 10 lg(2 / 3) dB below its peak as dBFS counts."""
    return white(window, 1, seed, 0.0)[:, 0] * level(dbfs + 10 * log10(3 / 2))


def read(output, of_input, bin=BIN, rate=RATE):
    found = periodogram(output, rate)
    spectra = Spectra(found, periodogram(of_input, rate), periodogram(output - of_input, rate), noise_floor(found), bin)
    return setting_of(spectra, "", 0.0, 0)


def decibels(*levels):
    """The sum of their powers."""
    return 10 * log10(sum(10 ** (each / 10) for each in levels))


# What is put in is read back


def test_a_known_set_of_harmonics():
    clean = tone_of(BIN, -3.0)
    levels = {2: -70.0, 3: -85.0, 5: -100.0}
    noise = -125.0
    found = read(clean + sum(tone_of(order * BIN, each) for order, each in levels.items()) + hiss(noise), clean)
    assert found.fundamental_dbfs == pytest.approx(-3.0, abs=0.01)
    assert found.thd_db == pytest.approx(decibels(*levels.values()) + 3.0, abs=0.05)
    assert found.thd_at_most_db == pytest.approx(decibels(*levels.values()) + 3.0, abs=0.05)
    in_band = noise + 10 * log10(20 / 24)
    assert found.residual_dbfs == pytest.approx(decibels(*levels.values(), in_band), abs=0.05)
    assert found.thd_n_db == pytest.approx(found.residual_dbfs + 3.0, abs=0.01)
    assert found.added_dbfs == pytest.approx(found.residual_dbfs, abs=0.01)
    assert found.of_input_thd_n_db == -inf
    assert [(line.order, line.relation, line.source) for line in found.lines] == [
        (order, "harmonic", "realization") for order in levels]
    for line, (order, each) in zip(found.lines, levels.items(), strict=True):
        assert line.dbfs == pytest.approx(each, abs=0.05)
        assert line.hz == pytest.approx(order * BIN * RATE / WINDOW)
        assert line.over_fundamental_db == pytest.approx(each + 3.0, abs=0.05)


@pytest.mark.parametrize("place", [4000.0, 4000.37, 4000.5])
def test_a_spurious_line_between_bins(place):
    clean = tone_of(BIN, 0.0)
    (line,) = read(clean + line_of(place, -80.0) + hiss(-110.0), clean).lines
    assert (line.relation, line.order, line.source) == ("neither", None, "realization")
    assert line.dbfs == pytest.approx(-80.0, abs=0.05)
    assert line.added_dbfs == pytest.approx(-80.0, abs=0.05)
    assert line.hz == pytest.approx(place * RATE / WINDOW, abs=0.05 * RATE / WINDOW)


def test_a_line_that_the_input_brought_is_told_apart():
    clean = tone_of(BIN, 0.0) + line_of(4000.0, -80.0)
    (line,) = read(clean + hiss(-110.0), clean).lines
    assert line.source == "input"
    assert line.of_input_dbfs == pytest.approx(-80.0, abs=0.05)
    assert line.added_dbfs < -130.0


def test_an_alias_of_a_harmonic():
    bin = round(19000 * WINDOW / RATE)
    clean = tone_of(bin, 0.0)
    (line,) = read(clean + tone_of(WINDOW - 2 * bin, -90.0) + hiss(-120.0), clean, bin).lines
    assert (line.relation, line.order) == ("alias", 2)
    assert line.hz == pytest.approx(RATE - 2 * 19000, abs=2.0)


def test_a_known_noise():
    """Even lines at every seventh bin: its power is known, and no chance in it."""
    bins = np.arange(200, 20000, 7)
    each = 1e-4 * np.sqrt(1 / len(bins))
    spectrum = np.zeros(WINDOW // 2 + 1, complex)
    spectrum[bins] = each * WINDOW / 2 * np.exp(1j * np.arange(len(bins)) ** 2)
    clean = tone_of(BIN, -1.0)
    found = read(clean + np.fft.irfft(spectrum, WINDOW), clean)
    assert found.residual_dbfs == pytest.approx(-80.0, abs=0.05)
    assert found.thd_n_db == pytest.approx(-79.0, abs=0.05)


def test_white_noise_in_the_band():
    """Of one window the power of 42,000 degrees of freedom, halved by the window, scatters by 0.04 dB."""
    clean = tone_of(BIN, -1.0)
    found = read(clean + hiss(-60.0), clean)
    assert found.residual_dbfs == pytest.approx(-60.0 + 10 * log10(20 / 24), abs=0.13)
    assert found.lines == ()
    assert found.thd_db is None
    assert found.thd_at_most_db < -75.0


def test_an_offset_is_no_distortion():
    clean = tone_of(BIN, -3.0)
    with_line = clean + line_of(4000.0, -90.0)
    found = read(with_line + 0.25, clean)
    assert found.residual_dbfs == pytest.approx(-90.0, abs=0.05)


@pytest.mark.parametrize(("hertz", "weight"), [(100.0, -19.1), (3150.0, 1.2), (10000.0, -2.5)])
def test_a_weighting_of_what_is_left(hertz, weight):
    """IEC 61672-1:2013, Table 3, as quoted, printed to 0.1 dB."""
    clean = tone_of(BIN, 0.0)
    found = read(clean + line_of(hertz * WINDOW / RATE, -60.0), clean)
    assert found.residual_a_dbfs == pytest.approx(-60.0 + weight, abs=0.1)
    assert found.thd_n_a_db == pytest.approx(-60.0 + weight, abs=0.1)


# What stands out of noise


def test_noise_alone_shows_a_line_as_seldom_as_it_says():
    """Once in 1,000 windows: of 100, two or more with a chance of 1 in 200."""
    seen = 0
    for seed in range(100):
        spectrum = periodogram(hiss(-60.0, QUICK, seed), RATE)
        seen += bool((spectrum.power > alarm(len(spectrum.power)) * noise_floor(spectrum)).any())
    assert seen < 2


def test_a_line_just_above_the_alarm_is_found():
    bins = QUICK // 2
    over_mean = alarm(bins)
    assert exp(-over_mean) * bins < 1e-3 < exp(-0.9 * over_mean) * bins
    mean = -60.0 - 10 * log10(bins)
    clean = tone_of(BIN, 0.0, QUICK)
    # A coherent line has two thirds of its power in its bin; 4 dB more and noise hardly takes it below the alarm.
    at = mean + 10 * log10(over_mean * 3 / 2) + 4.0
    found = read(clean + line_of(4001, at, QUICK) + hiss(-60.0, QUICK), clean)
    assert [line.relation for line in found.lines] == ["neither"]


def test_windows_have_no_two_frames_of_one_phase():
    for rate in (8000, 44100, 48000, 96000):
        window = window_frames(rate, quick=False)
        assert rate <= window < 1.25 * rate
        assert window % 2
        realization = realize(Filter.from_coefficients([1.0], rate=rate))
        bins = tone_bins(Responses(realization, 0, (0,)), window)
        assert len(bins) == 4
        for bin in bins:
            phases = np.arange(window) * bin % window
            assert bin % 2
            assert len(np.unique(phases)) == window


def test_the_dither_is_triangular():
    values = triangular(100_000, seed=3)
    assert abs(values).max() < 1.0
    # variance 1/6, kurtosis 2.4; six sigma of 100,000 independent values
    assert values.mean() == pytest.approx(0.0, abs=6 * np.sqrt(1 / 6 / 1e5))
    assert values.var() == pytest.approx(1 / 6, abs=6 / 6 * np.sqrt(1.4 / 1e5))
    assert abs(np.corrcoef(values[1:], values[:-1])[0, 1]) < 6 / np.sqrt(1e5)


# Roundings of known size


def rounding_to(bits, rate=40000, **more):
    """A wire of 32 bits whose output has fewer. At 40 kHz the band from 20 Hz to 20 kHz is all there is."""
    format = Fixed(f"Q1.{bits - 1}", input="Q1.31", operand="Q1.31", coefficients="Q2.14", rounding="half-even", **more)
    return realize(Filter.from_coefficients([1.0], rate=rate), form="direct-1", format=format)


def at_997(realization, level_dbfs):
    settings = tone(realization, [level_dbfs], quick=True, idle=False).settings
    return min((each for each in settings if each.level_dbfs == level_dbfs), key=lambda each: abs(each.hz - 997.0))


# 10 lg of the mean squares of sine and error, 6.02 N + 1.76: Oppenheim & Schafer ch. 6; 0 dBFS as AES17-2015, 3.12.1.
@pytest.mark.parametrize(("bits", "snr"), [
    (8, 49.93), (16, 98.09), (24, 146.26), pytest.param(12, 74.01, marks=pytest.mark.slow),
    pytest.param(20, 122.17, marks=pytest.mark.slow),
])
def test_rounding_a_full_scale_tone_to_n_bits(bits, snr):
    """At -0.1 dBFS: the largest code of 8 bits lies 0.07 dB below full scale."""
    near = at_997(rounding_to(bits), -0.1)
    assert near.thd_n_db == pytest.approx(-snr + 0.1, abs=0.3)


# With triangular dither the total error is 1/4 of a step squared: Lipshitz, Wannamaker & Vanderkooy, JAES 40 (1992).
@pytest.mark.parametrize(("bits", "snr"), [(8, 45.15), pytest.param(16, 93.32, marks=pytest.mark.slow)])
def test_rounding_with_dither_is_louder_and_has_no_harmonics(bits, snr):
    """At -20 dBFS, where dither cannot take the peaks out of range."""
    for each in tone(rounding_to(bits, dither="tpdf"), [], idle=False).settings:
        assert each.thd_n_db == pytest.approx(-snr + 20.0, abs=0.3)
        assert each.lines == ()
        assert each.thd_db is None


def test_a_low_tone_has_harmonics_unless_it_is_dithered():
    """2 steps of 12 bits; 1 step's peak is -66.2 dBFS."""
    for dither in (None, "tpdf"):
        near = at_997(rounding_to(12, RATE, dither=dither), -60.0)
        own = [line for line in near.lines if line.source == "realization"]
        assert bool(own) == (dither is None)
        assert (near.thd_db is None) == (dither is not None)
        assert near.of_input_thd_db is None


def test_what_rounding_the_input_did_is_not_the_realizations():
    """Nothing else is rounded: an input of 12 bits, and 28 behind it."""
    format = Fixed("Q1.27", input="Q1.11", output="Q1.27", coefficients="Q2.14")
    realization = realize(Filter.from_coefficients([0.5], rate=RATE), form="direct-1", format=format)
    found = tone(realization, [-60.0], quick=True, idle=False)
    for each in found.settings:
        assert each.added_dbfs == -inf
        assert each.thd_n_db == each.of_input_thd_n_db
        assert {line.source for line in each.lines} <= {"input"}
    assert found.added_dbfs == -inf


# Idle tones


def test_a_constant_between_steps_makes_error_feedback_sing():
    """The error is fed back: a constant of 1/10 step comes out as a pulse every ten frames, a line at 4800 Hz."""
    format = Fixed("Q1.15", input="Q1.31", operand="Q1.31", coefficients="Q2.14")
    realization = realize(Filter.from_coefficients([0.5], [1.0, -0.5], rate=RATE), form="error-feedback-1", format=format)
    idle = next(each for each in tone(realization, [-20.0], quick=True).idle if each.constant_lsb == 0.1)
    assert idle.found
    assert idle.line.hz % 4800.0 == pytest.approx(0.0, abs=0.5)


def test_a_rounding_with_dither_has_no_idle_tones():
    found = tone(rounding_to(12, RATE, dither="tpdf"), [-20.0], quick=True).idle
    assert len(found) > 10
    assert not any(each.found for each in found)
    for each in found:
        assert each.over_floor_db < each.alarm_over_floor_db


# What becomes of it


def test_what_was_done_is_kept_when_broken_off():
    calls = count(1)

    def report(share, doing):
        assert 0.0 <= share < 1.0
        if next(calls) == 3:
            raise KeyboardInterrupt

    found = tone(rounding_to(12), [0.0], quick=True, idle=False, report=report)
    assert not found.complete
    assert len(found.settings) == 2
    assert "THD+N" in "\n".join(told(found))


def test_a_filter_that_does_not_settle_has_no_tones():
    realization = realize(Filter.from_coefficients([1.0], [1.0, -1.0], rate=RATE), format="float64", allow_unstable=True)
    found = tone(realization)
    assert found.thd_n_db is None
    assert list(told(found)) == ["No figures: with its coefficients rounded the filter does not settle within 20 s."]


def test_a_result_is_the_same_again_and_becomes_a_document():
    first, second = (tone(rounding_to(12), [], quick=True, idle=False) for _ in range(2))
    assert first == second
    document = document_of(first)
    assert document["settings"][0]["thd_n_db"] == first.settings[0].thd_n_db
    assert "worst_spectrum" not in document
    assert first.worst_spectrum.samples.shape == (first.window_frames, 1)


PRESET = """
rate = 48000
[[filter]]
b = [1.0]
[structure]
form = "direct-1"
[format]
signal = "Q1.11"
input = "Q1.31"
operand = "Q1.31"
coefficients = "Q2.14"
[limits]
thd_n_db = {allowed}
"""


@pytest.mark.parametrize(("allowed", "meets"), [(-54.0, True), (-56.0, False)])
def test_thd_n_is_a_limit(allowed, meets, tmp_path):
    """12 bits at -20 dBFS: 74.01 - 20 dB, and 0.79 less noise in the band."""
    path = tmp_path / "wire.toml"
    path.write_text(PRESET.format(allowed=allowed), encoding="utf-8")
    preset = load_preset(str(path))
    (verdict,) = limit_verdicts(preset, realize_preset(preset))
    assert verdict.found == pytest.approx(-74.01 - 0.79 + 20.0, abs=0.5)
    assert verdict.meets == meets
    assert verdict.about.endswith("Hz and -20 dBFS")


def test_a_tone_is_told_and_written(tmp_path, capsys):
    path = tmp_path / "wire.toml"
    path.write_text(PRESET.format(allowed=-50.0), encoding="utf-8")
    assert main(["measure", str(path), "--only", "tone", "--quick", "--output", str(tmp_path / "waves")]) == 0
    shown = capsys.readouterr().out
    assert "Where nothing overflows it adds at most" in shown
    assert "Strongest line of its own: " in shown
    names = sorted(each.name for each in (tmp_path / "waves").iterdir())
    assert names[1] == "wire-tone-worst.wav"
    assert names[0].startswith("wire-tone-worst-difference-raised-")
