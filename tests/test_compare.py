"""`streamhost compare`: the main job."""

import errno
import json
import os

import numpy as np
import pytest

from streamhost import load_preset, realize, shipped
from streamhost.commands.compare_files import LONGEST_VARIED
from streamhost.commands.main import main
from streamhost.files import AudioWriter, read_all
from streamhost.measure import Measurement
from streamhost.program.ideal import ideal_program, quantized_input
from streamhost.signals import white

RATE = 48000
KEYS = [
    "preset", "title", "decomposition", "form", "format", "response_deviation_db", "response_deviation_hz", "leak_db",
    "noise_dbfs", "noise_interval_db", "noise_full_dbfs", "noise_a_dbfs", "noise_predicted_dbfs", "white_model_holds", "dc_lsb",
    "peak_dbfs", "difference_gain_db", "output", "difference", "unstable", "saturations", "wraps", "accumulator_overflows",
    "multiplications", "additions", "delays", "ns_per_frame",
]
PEAK = """
title = "{title}"
rate = {rate}

[[filter]]
kind = "peak"
frequency = {frequency}
gain_db = 6.0
q = 2.0

[structure]
form = "{form}"

[format]
{format}
"""


@pytest.fixture
def preset(tmp_path):
    """Writes a preset file and gives its name."""

    def write(name="peak", *, title="Peak", rate=RATE, frequency=3000.0, form="direct-1", format='signal = "Q1.15"',
              more=""):
        path = tmp_path / f"{name}.toml"
        text = PEAK.format(title=title, rate=rate, frequency=frequency, form=form, format=format)
        path.write_text(text + more, encoding="utf-8")
        return str(path)

    return write


def figures_of(capsys, *arguments, status=0):
    """The JSON document of a comparison."""
    assert main(["compare", *arguments, "--json", "-"]) == status
    return json.loads(capsys.readouterr().out)


# The main job


def test_the_shipped_presets_on_the_shipped_audio(tmp_path, capsys):
    names = sorted(path.stem for path in shipped.folder("preset").glob("rumble-*.toml"))
    folder, figures = tmp_path / "compared", tmp_path / "figures.json"
    assert main(["compare", *names, "--input", "plucked", "--output", str(folder), "--json", str(figures)]) == 0
    shown = capsys.readouterr().out
    document = json.loads(figures.read_text(encoding="utf-8"))
    assert list(document) == ["rate", "input", "seed", "realizations", "refused"]
    assert (document["rate"], document["input"], document["seed"]) == (RATE, "plucked", 1)
    assert len(document["realizations"]) == len(names) >= 6
    for number, (name, row) in enumerate(zip(names, document["realizations"], strict=True), 1):
        assert list(row) == KEYS
        assert row["preset"] == name
        assert row["title"] in shown
        assert row["output"] == str(folder / f"{number}-{name}.wav")
        assert row["difference"] == str(folder / f"{number}-{name}-difference.wav")
    assert sorted(path.name for path in folder.iterdir()) == sorted(
        f"{number}-{name}{kind}.wav" for number, name in enumerate(names, 1) for kind in ("", "-difference"))
    by_name = dict(zip(names, document["realizations"], strict=True))
    # 16-bit coefficients put a pole on z = 1: no response and no noise to speak of
    naive = by_name["rumble-naive-16-bit"]
    assert naive["unstable"] == 1
    assert naive["response_deviation_db"] is naive["noise_dbfs"] is naive["noise_predicted_dbfs"] is None
    assert naive["white_model_holds"] is None
    assert "3 has no noise figure and no verdict on the white model: with its coefficients rounded" in shown
    assert "1: the white model does not hold here: the output drops values of variance" in shown  # it fades to silence
    assert ".q0" not in shown
    assert "3 is unstable with its coefficients rounded: 1 pole" in shown
    assert "2 of 2 with limits meet every limit; 3, 4, 5, 6 state none." in shown
    # 16-bit state: -33.6 dBFS in the band and -29.5 over all are what the closed form of 1/A gives
    assert by_name["rumble-naive-16-bit-state"]["noise_predicted_dbfs"] == pytest.approx(-33.6, abs=0.1)
    assert by_name["rumble-naive-24-bit"]["noise_predicted_dbfs"] == pytest.approx(-33.6 - 48.2, abs=0.1)
    assert by_name["rumble-naive-shared-delays"]["saturations"] > 1000
    assert all(len(line) <= 160 for line in shown.splitlines() if "─" in line)


def test_without_an_output_nothing_is_written(preset, recording, tmp_path, capsys):
    before = sorted(tmp_path.iterdir())
    name = preset()
    assert main(["compare", name, "--input", recording]) == 0
    assert sorted(tmp_path.iterdir()) == sorted([*before, tmp_path / "peak.toml"])
    shown = capsys.readouterr().out
    assert "seed" not in shown
    assert "direct-1 · cascade · Q1.15" in shown


def test_the_files_hold_what_they_say(preset, recording, tmp_path):
    names = [preset("short"), preset("long", format='signal = "Q1.15"\nstate = "Q1.31"\noutput = "Q1.23"')]
    folder = tmp_path / "out"
    assert main(["compare", *names, "--input", recording, "--output", str(folder)]) == 0
    x, _ = read_all(recording)
    for name, stem, subtype in zip(names, ("1-short", "2-long"), ("PCM_16", "PCM_24"), strict=True):
        stated = load_preset(name)
        realization = realize(stated.filter, form=stated.form, format=stated.format)
        output, info = read_all(folder / f"{stem}.wav")
        difference, float_info = read_all(folder / f"{stem}-difference.wav")
        assert (info.subtype, info.rate, float_info.subtype) == (subtype, RATE, "FLOAT")
        assert np.array_equal(output, realization.process(x))
        ideal = realize(stated.filter, form=stated.form, format="float64")
        diagram = ideal_program(realization.program).diagram
        ideal.program = type(ideal.program)(diagram, diagram, ideal.format, types=("float64",) * len(diagram.nodes))
        wanted = output - ideal.process(quantized_input(realization.program, x))
        assert difference == pytest.approx(wanted, abs=2.0**-24 * np.abs(wanted).max() + 1e-12)  # 32-bit floats


def test_the_gain_brings_the_difference_to_its_level(preset, recording, tmp_path, capsys):
    folder = tmp_path / "out"
    row = figures_of(capsys, preset(), "--input", recording, "--output", str(folder))["realizations"][0]
    difference, _ = read_all(row["difference"])
    raised = 20.0 * np.log10(np.abs(difference).max()) + row["difference_gain_db"]
    assert -13.0 < raised <= -12.0


def test_a_family_of_one_preset(preset, recording, capsys):
    document = figures_of(capsys, preset(), "--input", recording, "--vary", "structure.form=direct-1,transposed-2",
                          "--vary", "format.signal=Q1.15,Q1.23")
    rows = document["realizations"]
    assert [(row["form"], row["format"]) for row in rows] == [
        ("direct-1", "Q1.15"), ("direct-1", "Q1.23"), ("transposed-2", "Q1.15"), ("transposed-2", "Q1.23")]
    assert [row["delays"] for row in rows] == [4, 4, 2, 2]
    assert {(row["multiplications"], row["additions"]) for row in rows} == {(5, 4)}
    assert all(row["white_model_holds"] for row in rows)
    for row in rows:
        assert row["noise_dbfs"] == pytest.approx(row["noise_predicted_dbfs"], abs=max(0.5, row["noise_interval_db"]))
    assert document["seed"] is None


def test_what_was_varied_tells_rows_and_files_apart(preset, recording, tmp_path, capsys):
    title = "A title that would fill the whole column of the table by itself"
    folder = tmp_path / "out"
    assert main(["compare", preset("mine", title=title), "--input", recording, "--output", str(folder),
                 "--vary", "structure.form=direct-1,direct-2", "--vary", "format.rounding=half-up,floor",
                 "--vary", "filter.gain_db=-6"]) == 0
    varied = [("direct-1", "half-up"), ("direct-1", "floor"), ("direct-2", "half-up"), ("direct-2", "floor")]
    rows = [line for line in capsys.readouterr().out.splitlines() if "A title" in line]
    for (form, rounding), row in zip(varied, rows, strict=True):
        assert f"…, {form}, {rounding}, gain_db -6  " in row
    assert sorted(path.name for path in folder.iterdir()) == sorted(
        f"{number}-mine-{form}-{rounding}-gain_db--6{kind}.wav"
        for number, (form, rounding) in enumerate(varied, 1) for kind in ("", "-difference"))


def test_varied_values_make_names_that_a_disk_takes(preset, recording, tmp_path):
    folder = tmp_path / "out"
    states = '{ word = "Q1.31", rounding = "floor" },"Q1.23"'
    assert main(["compare", preset("mine"), "--input", recording, "--output", str(folder),
                 "--vary", f"format.state={states}", "--vary", f"title={'a/b:' * 40}"]) == 0
    names = sorted(path.name for path in folder.iterdir())
    assert len(names) == 4
    assert names[0].startswith("1-mine-state-word-Q1.31-rounding-floor-a-b-a-b-")
    assert names[2].startswith("2-mine-Q1.23-a-b-a-b-")
    assert max(map(len, names)) <= len("1-mine-difference.wav") + LONGEST_VARIED


def test_the_same_command_gives_the_same_figures(preset, recording, capsys):
    name = preset()
    first, second = (figures_of(capsys, name, "--input", recording) for _ in range(2))
    for document in (first, second):
        assert document["realizations"][0].pop("ns_per_frame") > 0.0
    assert first == second


@pytest.mark.parametrize("frames", [1, 63, 1000, 4097])
def test_short_recordings_give_what_they_can(frames, preset, tmp_path, capsys):
    path = tmp_path / "short.wav"
    with AudioWriter(path, rate=RATE, channels=1, subtype="pcm16") as writer:
        writer.write(white(frames, 1, 5, -20.0))
    row = figures_of(capsys, preset(), "--input", str(path), "--output", str(tmp_path / "out"))["realizations"][0]
    assert read_all(row["output"])[1].frames == frames
    assert (row["noise_dbfs"] is None) == (frames < 128)
    assert row["white_model_holds"] is (True if frames > 4096 + 64 else None)


def test_floats_are_estimated_and_said_to_be(preset, recording, capsys):
    name = preset(format='arithmetic = "float32"')
    assert main(["compare", name, "--input", recording]) == 0
    assert "in floating point the predicted noise is an estimate" in capsys.readouterr().out
    row = figures_of(capsys, name, "--input", recording)["realizations"][0]
    assert row["white_model_holds"] is row["dc_lsb"] is None
    assert row["noise_predicted_dbfs"] == pytest.approx(row["noise_dbfs"], abs=6.0)  # an estimate


def test_what_judges_float64_is_finer(preset, recording, capsys):
    assert main(["compare", preset(format='arithmetic = "float64"'), "--input", recording]) == 0
    assert "double-double" in capsys.readouterr().out


def test_what_runs_away_leaves_no_difference(recording, tmp_path, capsys):
    path = tmp_path / "away.toml"
    path.write_text('rate = 48000\nallow_unstable = true\n[[filter]]\nb = [1.0]\na = [1.0, -1.1]\n'
                    '[format]\narithmetic = "float32"\n', encoding="utf-8")
    folder = tmp_path / "out"
    row = figures_of(capsys, str(path), "--input", recording, "--output", str(folder))["realizations"][0]
    assert row["unstable"] == 1
    assert row["difference"] is row["difference_gain_db"] is row["noise_dbfs"] is row["peak_dbfs"] is None
    assert [file.name for file in folder.iterdir()] == ["1-away.wav"]


# Limits


def test_limits_beyond_noise_and_response(preset, recording, capsys):
    name = preset(more="\n[limits]\nheadroom_db = -20.0\nmultiplications = 4\n")
    assert main(["compare", name, "--input", recording]) == 1
    assert "1 misses multiplications: 5, at most 4." in capsys.readouterr().out


@pytest.mark.parametrize(("noise", "deviation", "status", "said"), [
    (-60.0, 1.0, 0, "1 of 1 with limits meets every limit."),
    (-140.0, 1.0, 1, "1 misses noise_dbfs"),
    (-60.0, 1e-9, 1, "1 misses response_deviation_db"),
])
def test_limits(noise, deviation, status, said, preset, recording, capsys):
    limits = f"\n[limits]\nnoise_dbfs = {noise}\nresponse_deviation_db = {deviation}\n"
    assert main(["compare", preset(more=limits), "--input", recording]) == status
    shown = capsys.readouterr().out
    assert said in shown
    assert "seed 1" in shown


def test_misses_are_said_beside_figures_on_standard_output(preset, recording, capsys):
    name = preset(more="\n[limits]\nnoise_dbfs = -140.0\n")
    assert main(["compare", name, "--input", recording, "--json", "-"]) == 1
    captured = capsys.readouterr()
    assert json.loads(captured.out)["seed"] == 1
    assert "1 misses noise_dbfs: −" in captured.err


# Requests that are wrong


def refusal(capsys, *arguments):
    assert main(["compare", *arguments]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert "Traceback" not in captured.err
    return captured.err


def test_other_filters_are_refused_by_name(preset, recording, capsys):
    said = refusal(capsys, preset("one"), preset("two", frequency=3000.5, title="Another"), "--input", recording)
    assert "two.toml (Another): not the filter that" in said


def test_another_rate_is_refused(preset, recording, capsys):
    said = refusal(capsys, preset(rate=44100), "--input", recording)
    assert "44100 Hz" in said
    assert "48000 Hz" in said


def test_a_missing_recording_is_refused(preset, capsys):
    assert "no shipped recording of this name" in refusal(capsys, preset(), "--input", "nowhere.wav")


def test_what_cannot_be_realized_is_told_of_all_presets_at_once(preset, recording, tmp_path, capsys):
    narrow = preset("narrow", format='signal = "Q1.15"\ncoefficients = "Q1.15"')
    unstable = tmp_path / "unstable.toml"
    unstable.write_text("rate = 48000\n[[filter]]\nb = [1.0]\na = [1.0, -2.0]\n", encoding="utf-8")
    first, second = refusal(capsys, narrow, str(unstable), preset(), "--input", recording).splitlines()
    assert first.startswith(f'{narrow}:16: coefficients = "Q1.15": The coefficient b1')
    assert second.startswith(f"{unstable}:2: The filter as asked is unstable: 1 of its poles lies on")


def test_messages_call_what_ships_by_the_name_that_was_given(preset, recording, tmp_path, capsys):
    said = refusal(capsys, "rumble-float32", preset(), "--input", recording)
    assert said.count("rumble-float32 (Rumble filter, float32) asks for") == 1
    assert "rumble-float32.toml" not in said
    said = refusal(capsys, preset(rate=44100), "--input", "plucked")
    assert "and plucked has 48000 Hz" in said


def test_existing_files_are_kept_unless_forced(preset, recording, tmp_path, capsys):
    folder = tmp_path / "out"
    arguments = [preset(), "--input", recording, "--output", str(folder)]
    assert main(["compare", *arguments]) == 0
    capsys.readouterr()
    assert "1-peak.wav: this file exists" in refusal(capsys, *arguments)
    assert main(["compare", *arguments, "--force"]) == 0


def test_existing_figures_are_kept_and_nothing_is_run(preset, recording, tmp_path, capsys):
    figures, folder = tmp_path / "figures.json", tmp_path / "out"
    figures.write_text("mine", encoding="utf-8")
    said = refusal(capsys, preset(), "--input", recording, "--output", str(folder), "--json", str(figures))
    assert "figures.json: this file exists" in said
    assert figures.read_text(encoding="utf-8") == "mine"
    assert not folder.exists()


@pytest.mark.parametrize("place", ["nowhere/figures.json", "noise.wav/figures.json", "."])
def test_a_place_where_no_figures_can_be_written_is_refused_before_the_run(place, preset, recording, tmp_path, capsys):
    folder = tmp_path / "out"
    refusal(capsys, preset(), "--input", recording, "--output", str(folder), "--json", str(tmp_path / place))
    assert not folder.exists()


def test_a_folder_that_may_not_be_written_is_told_before_the_run(preset, recording, tmp_path, monkeypatch, capsys):
    def denied(dir):
        raise PermissionError(errno.EACCES, os.strerror(errno.EACCES))

    monkeypatch.setattr("streamhost.commands.common.TemporaryFile", denied)
    folder = tmp_path / "out"
    arguments = [preset(), "--input", recording, "--output", str(folder), "--json", str(tmp_path / "figures.json")]
    assert main(["compare", *arguments]) == 3
    assert "figures.json: cannot write this file: Permission denied" in capsys.readouterr().err
    assert not folder.exists()


def test_figures_go_into_the_folder_that_the_run_makes(preset, recording, tmp_path):
    folder = tmp_path / "out"
    place = folder / "figures.json"
    assert main(["compare", preset(), "--input", recording, "--output", str(folder), "--json", str(place)]) == 0
    assert sorted(path.name for path in folder.iterdir()) == ["1-peak-difference.wav", "1-peak.wav", "figures.json"]


def test_the_input_is_never_overwritten(preset, tmp_path, capsys):
    folder = tmp_path / "out"
    folder.mkdir()
    path = folder / "1-peak.wav"
    with AudioWriter(path, rate=RATE, channels=1, subtype="pcm16") as writer:
        writer.write(white(1000, 1, 5, -20.0))
    said = refusal(capsys, preset(), "--input", str(path), "--output", str(folder), "--force")
    assert "over the input" in said


@pytest.mark.parametrize("place", ["noise.wav", "nowhere/out"])
def test_an_output_that_can_be_no_folder_is_refused(place, preset, recording, tmp_path, capsys):
    refusal(capsys, preset(), "--input", recording, "--output", str(tmp_path / place))


# An interruption


def test_an_interruption_leaves_whole_files_only(preset, recording, tmp_path, monkeypatch, capsys):
    blocks = 0
    step = Measurement.step

    def interrupted(self, x):
        nonlocal blocks
        blocks += 1
        if blocks == 13:
            raise KeyboardInterrupt
        return step(self, x)

    monkeypatch.setattr(Measurement, "step", interrupted)
    folder = tmp_path / "out"
    names = [preset("one"), preset("two", form="direct-2")]
    assert main(["compare", *names, "--input", recording, "--output", str(folder)]) == 130
    said = capsys.readouterr().err
    assert "Interrupted." in said
    assert f"{folder}: the files of the realizations that were done stay there." in said
    assert sorted(path.name for path in folder.iterdir()) == ["1-one-difference.wav", "1-one.wav"]
    assert read_all(folder / "1-one.wav")[1].frames == 2 * RATE


@pytest.mark.parametrize("there", [False, True])
@pytest.mark.parametrize(("failure", "status"), [(KeyboardInterrupt(), 130), (OSError(errno.ENOSPC, "No space left"), 3)])
def test_a_folder_made_for_nothing_goes(failure, status, there, preset, recording, tmp_path, monkeypatch, capsys):
    def broken(self, x):
        raise failure

    monkeypatch.setattr(Measurement, "step", broken)
    folder = tmp_path / "out"
    if there:
        folder.mkdir()
    assert main(["compare", preset(), "--input", recording, "--output", str(folder)]) == status
    assert folder.exists() is there
    assert "stay there" not in capsys.readouterr().err
