"""The report: words, ledgers, charts, figures."""

import re
from types import SimpleNamespace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from report_examples import EVIL, contents, lane, verdict

from streamhost import Filter, Fixed, realize
from streamhost.measure import noise
from streamhost.measure.noise_spectrum import averaged, third_octaves
from streamhost.measure.welch import SpectrumSum
from streamhost.report import page
from streamhost.report.chart import Axis, Chart, Edge, Line, Points, thinned, ticks
from streamhost.report.figure import columns_of
from streamhost.report.figures import limit_cycles, tones, transients
from streamhost.report.figures import noise as noise_figures
from streamhost.report.ledger import limits_ledger
from streamhost.report.svg import box_of, chart_data, chart_svg, place
from streamhost.report.verdict import verdict as said
from streamhost.report.words import escape, grouped, number, ranges

# --- words


def test_numbers_have_a_minus_that_is_one_and_none_before_zero() -> None:
    assert [number(each) for each in (-71.84, -0.01, None, float("-inf"), float("nan"))] == ["−71.8", "0.0", "–", "−∞", "–"]


def test_runs_of_numerals_are_drawn_together() -> None:
    found = [ranges(each) for each in ([3], [1, 2], [3, 4, 5, 6], [1, 3, 4, 5, 8])]
    assert found == ["3", "1 and 2", "3 to 6", "1, 3 to 5 and 8"]


def test_what_is_the_same_is_said_once() -> None:
    assert grouped([(1, "0.1 dB"), (2, "0.2 dB"), (3, "0.1 dB")]) == "0.1 dB for 1 and 3 and 0.2 dB for 2"
    assert grouped([(4, "0.1 dB")]) == "0.1 dB"


def test_texts_of_others_are_no_markup() -> None:
    assert escape('<b a="1">&\x1b') == "&lt;b a=&quot;1&quot;&gt;&amp;\N{REPLACEMENT CHARACTER}"


# --- verdict and ledger

GOOD, BAD = verdict(-98.0), verdict(-71.84, -84.0)


@pytest.mark.parametrize(("lanes", "sentence"), [
    ([lane(1, GOOD), lane(2, GOOD)], "Two of two meet every limit."),
    ([lane(1, GOOD), lane(2, BAD)], "One of two meets every limit: 1; 2 misses one or more."),
    ([lane(1, GOOD), lane(2, BAD, states=False)], "One of two meets every limit: 1; 2, not asked, would miss it."),
    ([lane(1, GOOD), lane(2, GOOD, states=False)], "One of two meets every limit: 1; 2, not asked, would meet it."),
    ([lane(1, GOOD), lane(2), lane(3)], "One of three meets every limit: 1; 2 and 3 are not asked."),
    ([lane(1, BAD), lane(2, BAD)], "None of two meet every limit; 1 and 2 miss one or more."),
    ([lane(1), lane(2)], "No limits are stated: not asked."),
    ([lane(1, GOOD, GOOD)], "Filter 1 meets both limits."),
    ([lane(1, GOOD, BAD, BAD)], "Filter 1 misses two of three limits."),
    ([lane(1)], "Filter 1: no limits are stated, not asked."),
])
def test_the_verdict_is_a_sentence(lanes, sentence) -> None:
    assert said(contents(*lanes)) == sentence


def noisy(level):
    return SimpleNamespace(measured_dbfs=level, each=())


def test_the_best_keeps_its_limits_and_has_the_least_noise() -> None:
    """The quietest does not win where it misses a limit."""
    lanes = [lane(1, GOOD, noise=noisy(-95.0)), lane(2, GOOD, noise=noisy(-98.0)), lane(3, BAD, noise=noisy(-120.0)),
             lane(4, GOOD, noise=noisy(None))]
    whole = contents(*lanes)
    assert whole.best is lanes[1]
    assert said(whole).endswith("Of these, 2 has the least noise: −98.0\N{NO-BREAK SPACE}dBFS.")


def test_a_miss_is_in_reverse_with_what_is_allowed() -> None:
    ledger = limits_ledger(contents(lane(1, verdict(-98.0, -84.0)), lane(2, BAD)))
    assert re.findall(r'class="miss"><span>(.*?)</span> <span>(.*?)</span>', ledger) == [("−71.8,", "at most −84")]
    assert re.findall(r'class="word">(\w[\w ]*)', ledger) == ["Verdict", "meets", "misses"]


def test_a_miss_is_not_hidden_by_rounding() -> None:
    assert "<span>−83.999," in limits_ledger(contents(lane(1, verdict(-83.9994, -84.0))))
    assert "<span>0.0999999," in limits_ledger(contents(lane(1, verdict(0.0999999, 0.1, "mask", rule="at least"))))


# --- charts


@given(st.floats(1e-3, 1e5), st.floats(1.001, 1e6), st.integers(90, 760), st.booleans())
def test_ticks_lie_inside_apart_and_say_where(low: float, ratio: float, pixels: int, log: bool) -> None:
    axis = Axis(low, low * ratio, "dB", log)
    found = ticks(axis, pixels, 40.0)
    places = np.array([value for value, _ in found])
    assert ((places >= low * (1 - 1e-6)) & (places <= axis.high * (1 + 1e-6))).all()
    across = place(axis, places, 0.0, float(pixels))
    assert (np.diff(across) >= 39.9 if log is False or ratio >= 10.0 else np.diff(across) > 0.0).all()
    for value, text in found:
        assert float(text.removesuffix(" dB")) == pytest.approx(value, rel=1e-6, abs=(axis.high - low) * 1e-6)


def test_hertz_are_told_in_thousands() -> None:
    assert [text for _, text in ticks(Axis(20.0, 20000.0, "Hz", True), 700.0, 52.0)] == [
        "20", "50", "100", "200", "500", "1 k", "2 k", "5 k", "10 k", "20 kHz"]


@given(st.integers(200, 3000), st.integers(0, 2999), st.booleans())
def test_thinning_loses_no_peak(count: int, at: int, log: bool) -> None:
    x, y = np.arange(1.0, count + 1.0), np.zeros(count)
    y[at % count], y[(at + 7) % count] = 1.0, -1.0
    kept_x, kept_y = thinned(x, y, 100, log=log)
    assert len(kept_x) <= 101 and (np.diff(kept_x) > 0.0).all()
    assert kept_y.max() == 1.0 and kept_y.min() == -1.0
    assert kept_x[kept_y.argmax()] == at % count + 1


def test_a_curve_lies_where_its_axes_say() -> None:
    line = Line("heard", np.array([20.0, 200.0, 2000.0, 20000.0]), np.array([0.0, -10.0, np.nan, -30.0]), "1")
    chart = Chart("said", Axis(20.0, 20000.0, "Hz", True), Axis(-40.0, 0.0, "dB"), (line, Edge("y", -20.0, 1, "at most")))
    box, svg = box_of(chart, 760.0, 300.0), chart_svg(chart, "f1-1", 760.0, 300.0)
    (path,) = re.findall(r'class="line heard" d="([^"]*)"', svg)
    third = box.left + (box.right - box.left) / 3.0
    quarter = box.top + (box.bottom - box.top) / 4.0
    low = box.top + 3.0 * (box.bottom - box.top) / 4.0
    assert path == f"M{box.left:.1f} {box.top:.1f}L{third:.1f} {quarter:.1f}M{box.right:.1f} {low:.1f}"
    (data, _) = chart_data(chart, 760.0, 300.0)["items"]
    assert data["x"] == [20.0, 200.0, 2000.0, 20000.0] and data["y"] == [0.0, -10.0, None, -30.0]
    assert ">at most</text>" in svg


def test_lozenges_are_no_denser_than_can_be_seen() -> None:
    points = Points("lozenge", np.linspace(0.0, 1.0, 400), np.zeros(400))
    svg = chart_svg(Chart("", Axis(0.0, 1.0), Axis(-1.0, 1.0), (points,)), "k", 242.0, 184.0)
    (path,) = re.findall(r'class="point lozenge" d="([^"]*)"', svg)
    across = [float(each) for each in re.findall(r"M([\d.]+) ", path)]
    assert min(np.diff(across)) >= 11.9 and len(across) > 10


def test_rows_have_four_panels_at_most() -> None:
    assert [columns_of(count) for count in range(1, 10)] == [1, 2, 3, 4, 3, 3, 4, 4, 3]


# --- the noise's spectrum


def test_a_known_noise_and_a_known_line_are_read_back() -> None:
    """White noise of a known power has that over half the rate in each hertz; a line stands out in its own part only."""
    rate, power = 48000.0, 1e-10
    signal = np.sqrt(power) * np.random.default_rng(5).standard_normal(20 * 48000)
    signal += 1e-4 * np.sin(2 * np.pi * 3000.0 / rate * np.arange(len(signal)))
    spectra = SpectrumSum(rate, 1 << 14)
    spectra.add(signal)
    found = spectra.spectrum()
    hertz, dbfs = averaged(found.frequencies[1:], 10.0 * np.log10(2.0 * found.power[1:] / found.spacing), 24)
    level = 10 * np.log10(2 * power / (rate / 2))
    away = (hertz > 500.0) & (abs(hertz / 3000.0 - 1.0) > 0.03)
    # From 500 Hz on each part has 5 bins or more of 116 segments: a standard deviation of 0.2 dB at most.
    assert np.abs(dbfs[away] - level).max() < 1.0
    assert abs(np.mean(dbfs[away]) - level) < 0.05
    assert hertz[dbfs.argmax()] == pytest.approx(3000.0, rel=0.02)


def test_third_octaves_are_those_of_the_standard() -> None:
    """IEC 61260-1:2014, base ten: 10^(k/10) around 1 kHz; nominal 20 Hz, 25 Hz ... 20 kHz."""
    assert third_octaves(24000.0)[[0, 1, 17, -1]] == pytest.approx([19.953, 25.119, 1000.0, 19952.6], rel=1e-4)
    assert len(third_octaves(24000.0)) == 31 and third_octaves(4000.0)[-1] == pytest.approx(3981.1, rel=1e-4)


def test_prediction_and_measurement_meet_in_the_figure() -> None:
    """One rounding to 16 bits after a gain: white, a step squared over 12 (common practice), spread over half the rate."""
    realization = realize(Filter.from_coefficients([0.2871], rate=48000.0), form="direct-1", format=Fixed("Q1.15"))
    found = noise(realization, quick=True)
    (figure,) = noise_figures.figures(contents(lane(1, noise=found)))
    measured, predicted = figure.panels[0].chart.items
    level = 10.0 * np.log10(2.0 * 2.0**-30 / 12.0 / 24000.0)
    assert predicted.y == pytest.approx(level, abs=1e-6) and len(predicted.x) == 31
    # Above 1 kHz the mean is over 100 parts, each of 40 bins or more of some segments: 0.05 dB is several standard deviations.
    assert measured.y[measured.x > 1000.0].mean() == pytest.approx(level, abs=0.05)
    assert figure.caption.startswith(f"Noise: {number(found.measured_dbfs)} dBFS (predicted {number(found.predicted_dbfs)}).")


# --- figures of instruments


def cycle(result_lsb, period, wave):
    return SimpleNamespace(output_lsb=result_lsb, period_frames=period, wave=np.array(wave))


def cycles(**more):
    none = dict.fromkeys(("worst", "proven_lsb", "proven_bound_lsb", "found_lsb", "overflow_lsb"))
    return SimpleNamespace(**{**none, "reason": "", "seed": 1, **more})


def test_limit_cycles_are_drawn_in_steps_of_the_output() -> None:
    step = 2.0**-15
    lanes = [lane(1, limit_cycles=cycles(proven_lsb=3, found_lsb=3, worst=cycle(3, 2, [3 * step, -3 * step]))),
             lane(2, limit_cycles=cycles(proven_lsb=0)), lane(3, limit_cycles=cycles(reason="floating point"))]
    (figure,) = limit_cycles.figures(contents(*lanes))
    assert figure.caption == "Limit cycles: 3 LSB at most (proven) for 1, none (proven) for 2 and not asked for 3."
    heard = figure.panels[0].chart.items[0]
    assert set(heard.y) == {3.0, -3.0} and list(heard.y[:4]) == [3.0, 3.0, -3.0, -3.0]
    assert [panel.chart is None for panel in figure.panels] == [False, True, True]
    assert figure.panels[2].note == "Not asked. Floating point."


def test_a_tone_is_read_at_its_level_in_the_spectrum() -> None:
    """A bin of power 1/2, a full-scale sine's, is at 0 dBFS."""
    hertz = np.arange(1.0, 2001.0)
    power = np.full(2000, 1e-12)
    power[996] = 0.5
    setting = SimpleNamespace(hz=997.0, level_dbfs=-20.0, thd_n_db=-80.0, output="")
    result = SimpleNamespace(settings=(setting,), worst=setting, thd_n_db=-80.0, thd_n_level_dbfs=-20.0, added_dbfs=-100.0,
                             window_frames=4000, wait_frames=None, reason="", seed=1,
                             worst_spectrum=SimpleNamespace(hertz=hertz, output=power, floor=np.full(2000, 1e-12)))
    levels, spectra = tones.figures(contents(lane(1, tone=result)))
    assert "At −20 dBFS and the worst frequency: −80.0 dB." in levels.caption
    heard = spectra.panels[0].chart.items[0]
    assert heard.y[996] == pytest.approx(0.0, abs=1e-9) and heard.x[996] == 997.0


def test_a_change_is_drawn_around_its_frame() -> None:
    trace = SimpleNamespace(changeover="cold", change="q 1 to 2", signal="tone", at=48, heard=np.full(96, 0.1),
                            before=np.zeros(96), target=np.full(96, 0.2))
    result = SimpleNamespace(traces=(trace,), changeover="cold", click_468_dbfs=-31.5, change="q 1 to 2")
    (figure,) = transients.figures(contents(lane(1, transients=result)))
    assert figure.caption == "The worst click of a change: −31.5 dBFS by cold, q 1 to 2."
    heard = next(item for item in figure.panels[0].chart.items if item.role == "heard")
    assert heard.x[48] == 0.0 and heard.x[0] == -1.0 and heard.y[0] == pytest.approx(10.0)


# --- the page


def test_the_page_needs_nothing_from_elsewhere_and_runs_no_text_of_others() -> None:
    text = page(contents(lane(1, GOOD), heading=EVIL, command=EVIL, remarks=(EVIL,)))
    addresses = set(re.findall(r"https?://[^\"' <]*", text))
    assert addresses <= {"http://www.w3.org/2000/svg"}
    assert "<img" not in text and text.count("<script") == 2
    assert not re.search(r"<[^>]*\s(style|on\w+)=", text)
    assert "default-src 'none'" in text and "unsafe" not in text
