"""`streamhost listen` on the clock: what it says, and that what is heard is what `render` gives."""

import json
from pathlib import Path

import numpy as np
import pytest
from audio_files import write

from streamhost.commands.main import main
from streamhost.files import read_all

PRESETS = ["rumble-float32", "rumble-double-state", "rumble-naive-24-bit"]
CHANGES = ["--change", "1000:2:carry", "--change", "2500:3:warm", "--change", "4000:1:fade"]
CLOCK = ["--no-device", "--no-page", "--fast"]


def listen(arguments: list[str]) -> int:
    return main(["listen", *arguments, *CLOCK])


def test_what_is_heard_is_what_render_gives_to_the_bit(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    given, heard, rendered, told = (tmp_path / name for name in ("in.wav", "heard.wav", "rendered.wav", "told.json"))
    write(given, np.random.default_rng(7).uniform(-0.2, 0.2, (6000, 2)))
    lanes = [part for preset in PRESETS[1:] for part in ("--lane", preset)]
    assert main(["render", PRESETS[0], str(given), str(rendered), *lanes, *CHANGES, "--subtype", "float"]) == 0
    said = capsys.readouterr().out.splitlines()
    assert "lane 2 is heard from frame 1000 on, by carry" in said
    assert "lane 3 is heard from frame 2500 on, by warm" in said
    figures = []
    for block in ("64", "1000"):
        files = ["--input", str(given), "--record", str(heard), "--json", str(told), "--force"]
        assert listen([*PRESETS, "--seconds", "0.125", "--block", block, *CHANGES, *files]) == 0
        assert np.array_equal(read_all(heard)[0], read_all(rendered)[0])
        figures.append(json.loads(told.read_text()))
    first, second = figures
    assert first.keys() >= {"blocks", "output_gaps", "input_gaps", "block_frames", "deadline_us", "step_p50_us", "step_p999_us",
                            "step_max_us", "lanes", "changes", "callback"}
    assert (first["blocks"], first["block_frames"], first["frames"]) == (94, 64, 6000)
    assert first["deadline_us"] == pytest.approx(64 / 0.048)
    assert 0 < first["step_p50_us"] <= first["step_p999_us"] <= first["step_max_us"]
    assert [(each["frame"], each["lane"], each["before"], each["changeover"]) for each in first["changes"]] == [
        (1000, 2, 1, "carry"), (2500, 3, 2, "warm"), (4000, 1, 3, "fade")]
    assert [each["form"] for each in first["lanes"]] == ["transposed-2", "direct-1", "direct-1"]
    assert [each["state_sha256"] for each in first["lanes"]] == [each["state_sha256"] for each in second["lanes"]]


def test_figures_on_standard_output_stand_there_alone(capsys: pytest.CaptureFixture[str]) -> None:
    assert listen(["rumble-float32", "--seconds", "0.1", "--json", "-"]) == 0
    assert json.loads(capsys.readouterr().out)["frames"] == 4800


def test_a_generated_source_and_matched_lanes(capsys: pytest.CaptureFixture[str]) -> None:
    assert listen([*PRESETS[:2], "--source", "tone:1000@-6", "--seconds", "0.1", "--match", "--monitor-db", "-20"]) == 0
    said = capsys.readouterr().out
    assert "half of them within" in said
    assert "\N{MINUS SIGN}6.0" in said


@pytest.mark.parametrize(
    ("arguments", "status", "said"),
    [
        (["rumble-float32", "--seconds", "1"], 2, "Where the volume is down, say so by --volume-is-down"),
        (["rumble-float32"], 2, "Without a terminal and a page --seconds says when to end"),
        (["rumble-float32", "--seconds", "1", "--fast"], 2, "--fast is for --no-device"),
        (["rumble-float32", "--no-device", "--seconds", "1", "--source", "device"], 2, "is the sound card's input"),
        (["rumble-float32", "--no-device", "--no-page"], 2, "--seconds says when to end"),
        (["rumble-float32", "--no-device", "--seconds", "1", "--source", "hum"], 2, "a source is KIND"),
        (["rumble-float32", "--no-device", "--seconds", "1", "--source", "white", "--input", "chord"], 2, "give one of them"),
        (["rumble-float32", "--no-device", "--seconds", "1", "--rate", "96000"], 2, "96000 Hz is asked for"),
        (["rumble-float32", "--no-device", "--seconds", "1", "--change", "5:2:warm"], 2, "there is no lane 2"),
        (["rumble-float32", "--no-device", "--seconds", "1", "--json", "nowhere/it.json"], 2, "does not exist"),
    ],
)
def test_what_cannot_be_is_refused(
    arguments: list[str], status: int, said: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    assert main(["listen", *arguments]) == status
    assert said in capsys.readouterr().err


def test_a_change_that_render_never_reaches_is_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write(tmp_path / "in.wav", np.zeros((100, 2)))
    arguments = ["render", PRESETS[0], str(tmp_path / "in.wav"), str(tmp_path / "out.wav"), "--lane", PRESETS[1]]
    assert main([*arguments, "--change", "100:2:warm"]) == 2
    assert "is never reached" in capsys.readouterr().err
    assert not (tmp_path / "out.wav").exists()
