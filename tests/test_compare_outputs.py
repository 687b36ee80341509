"""Several outputs, channels that differ and several rates in what is measured and compared."""

import json

import numpy as np
import pytest

import streamhost as sh
from streamhost.commands.main import main
from streamhost.files import AudioWriter, read_all
from streamhost.formats import Fixed
from streamhost.measure import measure, predicted_noise, response_deviation
from streamhost.program import ideal
from streamhost.program.sources import noise_sources
from streamhost.signals import white

RATE = 48000
BAND = (20.0, 20000.0)
PRESET = """
title = "Two-way"
rates = [44100, 48000]

[[filter]]
kind = "dc-blocker"
frequency = 200
channels = [2]

[[filter]]
kind = "butterworth-crossover"
order = 1
frequency = 3000

[structure]
form = "direct-1"

[format]
signal = "Q1.15"
coefficients = "Q2.14"

[limits]
noise_dbfs = -91.0
"""


def stated(tmp_path):
    path = tmp_path / "two-way.toml"
    path.write_text(PRESET)
    return str(path)


def test_each_output_has_a_line_and_files_of_its_own(tmp_path, recording, capsys):
    preset, folder, figures = stated(tmp_path), tmp_path / "compared", tmp_path / "figures.json"
    assert main(["compare", preset, "--input", recording, "--output", str(folder), "--json", str(figures)]) == 1
    shown = capsys.readouterr().out.splitlines()
    rows = [line for line in shown if line.startswith(("1 low ", "1 high "))]
    assert len(rows) == 6  # in two tables and in the list of files
    (missed,) = (line for line in shown if "misses" in line)
    assert missed.startswith("1 misses noise_dbfs of low: ") and "high" not in missed
    assert any(line.startswith("1: coefficient rounding moves the sum of low and high by 0.0") for line in shown)

    (one,) = json.loads(figures.read_text())["realizations"]
    low, high = one["outputs"]
    assert (low["name"], high["name"]) == ("low", "high")
    assert "noise_dbfs" not in one and one["unstable"] == 0
    for output in (low, high):
        assert output["noise_channel"] == 2  # its DC blocker adds noise of its own
        assert output["noise_dbfs"] == pytest.approx(output["noise_predicted_dbfs"], abs=0.5)
        assert output["white_model_holds"] is True
    made = sh.realize(sh.load_preset(preset).at(RATE).filters(2), form="direct-1", format=Fixed("Q1.15", coefficients="Q2.14"))
    wanted = made.process(read_all(recording)[0])
    for k, output in enumerate((low, high)):
        assert output["output"] == str(folder / f"1-two-way-{output['name']}.wav")
        assert np.array_equal(read_all(output["output"])[0], wanted[:, k])
        difference = read_all(output["difference"])[0]
        assert 20 * np.log10(np.abs(difference).max()) + output["difference_gain_db"] == pytest.approx(-12.0, abs=1.0)


def test_a_file_of_a_rate_that_is_not_stated_is_refused(tmp_path, capsys):
    path = tmp_path / "other.wav"
    with AudioWriter(path, rate=96000, channels=2, subtype="pcm16") as writer:
        writer.write(np.zeros((100, 2)))
    assert main(["compare", stated(tmp_path), "--input", str(path)]) == 2
    assert "this preset has the rates 44100 and 48000 Hz, and " in capsys.readouterr().err


def test_presets_with_other_outputs_are_not_of_one_filter(tmp_path, recording, capsys):
    preset = stated(tmp_path)
    kinds = ["--vary", "filter.2.kind=butterworth-crossover,linkwitz-riley", "--vary", "filter.2.order=2"]
    assert main(["compare", preset, *kinds, "--input", recording]) == 2
    assert "not the filter that" in capsys.readouterr().err


def test_draw_takes_the_first_rate_and_vary_picks_another(tmp_path, capsys):
    preset, drawings = stated(tmp_path), []
    for rate in ([], ["--vary", "rate=44100"], ["--vary", "rate=48000"]):
        file = tmp_path / f"{len(drawings)}.svg"
        assert main(["draw", preset, "-o", str(file), *rate]) == 0
        drawings.append(file.read_text())
    assert drawings[0] == drawings[1] != drawings[2]


# What is measured


def crossover(order=1, frequency=3000):
    return sh.design("butterworth-crossover", rate=RATE, order=order, frequency=frequency)


def test_prediction_at_an_output_is_that_of_its_filter_alone():
    made = sh.realize(crossover(2), form="direct-1", format=Fixed("Q1.15", coefficients="Q3.13"))
    for k, branch in enumerate(made.filter.branches):
        alone = sh.realize(branch.filter, form="direct-1", format=made.format)
        wanted, found = predicted_noise(alone.program, RATE), predicted_noise(made.program, RATE, output=k)
        assert found.dbfs == pytest.approx(wanted.dbfs, abs=1e-6)
        assert found.full_dbfs == pytest.approx(wanted.full_dbfs, abs=1e-6)
        assert response_deviation(made, BAND, (k,)).db == pytest.approx(response_deviation(alone, BAND).db, rel=1e-6)


def test_the_sum_of_outputs_is_judged_by_the_sum_as_asked():
    """Where both halves are rounded to so few bits that they no longer fit together, the sum is off and flat no more."""
    made = sh.realize(crossover(3), form="direct-1", format=Fixed("Q1.15", coefficients={"bits": 8}))
    found = response_deviation(made, BAND, (0, 1))
    w = 2 * np.pi * np.geomspace(*BAND, 2000) / RATE
    summed = made.program.diagram.transfer_function().response(w)[:, :, 0].sum(axis=1)
    # the sum as asked is all-pass: its deviation is that from 0 dB; the grids differ
    assert found.db == pytest.approx(np.abs(20 * np.log10(np.abs(summed))).max(), rel=0.02)
    assert found.db > 0.05


def test_channels_with_coefficients_of_their_own_are_judged_apart():
    """The wire on the first channel rounds nothing; pooled, the two would have half the variance that is expected."""
    filters = (sh.Filter.from_coefficients([1.0], rate=RATE), sh.design("dc-blocker", rate=RATE, frequency=3000))
    made = sh.realize(filters, form="direct-1", format=Fixed("Q1.15", coefficients="Q2.14"))
    assert [len(noise_sources(made.program, channel)) for channel in range(2)] == [0, 1]
    found = measure(made, white(2 * RATE, 2, 3, -20.0), BAND)
    alone = measure(sh.realize(filters[1], form="direct-1", format=made.format), white(2 * RATE, 2, 3, -20.0)[:, 1:], BAND)
    assert found.outputs[0].channel == 2 and alone.outputs[0].channel is None
    assert found.white.holds is True
    assert (found.noise, found.prediction) == (alone.noise, alone.prediction)
    assert found.noise.dbfs == pytest.approx(found.prediction.dbfs, abs=max(0.5, found.noise.interval_db))


def test_the_ideal_is_fine_enough_for_every_output_of_every_channel(monkeypatch):
    """Whatever margin is asked for: double-double where one of the filters alone would need it."""
    low, high = (sh.design(kind, rate=RATE, frequency=frequency, q=0.7)
                 for kind, frequency in (("low-pass", 20), ("high-pass", 8000)))
    asked = [low, high, sh.Filter.split({"low": low, "high": high}), sh.Filter.split({"high": high, "low": low}), (high, low)]
    programs = [sh.realize(each, form="direct-1", format=Fixed("Q1.31", coefficients="Q2.30")).program for each in asked]
    found = []
    for margin in (100, 140, 170):
        monkeypatch.setattr(ideal, "MARGIN_DB", float(margin))
        found.append([ideal.ideal_of(program).double for program in programs])
    assert all(row[2:] == [row[0] or row[1]] * 3 for row in found)
    assert [row[:2] for row in found] == [[False, False], [False, True], [True, True]]
