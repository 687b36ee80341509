"""What `streamhost render` refuses or does not finish leaves nothing half written, and what was there as it was."""

import errno
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest
import soundfile
from audio_files import file_size_limit
from render_files import CROSSOVER, FIXED, preset, source

import streamhost as sh
from streamhost.commands.main import main
from streamhost.files import atomic, probe


def refused(arguments: list[str], capsys: pytest.CaptureFixture[str], status: int = 2) -> str:
    assert main(["render", *arguments]) == status
    said = capsys.readouterr()
    assert said.out == ""
    return said.err


def test_a_file_of_another_rate_is_refused_naming_both(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    stated = preset(tmp_path, FIXED)
    Path(stated).write_text(Path(stated).read_text().replace("48000", "44100"))
    given = source(tmp_path)
    said = refused([stated, given, str(tmp_path / "out.wav")], capsys)
    assert f"{stated}: this preset has a rate of 44100 Hz, and {given} has 48000 Hz" in said
    assert not (tmp_path / "out.wav").exists()


@pytest.mark.parametrize("force", [[], ["--force"]])
@pytest.mark.parametrize("name", ["in.wav", "link.wav", "hard.wav", "../{folder}/in.wav"])
def test_the_input_is_never_the_output(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], name: str, force: list[str]
) -> None:
    given = source(tmp_path, 100)
    before = Path(given).read_bytes()
    (tmp_path / "link.wav").symlink_to("in.wav")
    (tmp_path / "hard.wav").hardlink_to(given)
    out = tmp_path / name.format(folder=tmp_path.name)
    assert "input and output are the same file" in refused([preset(tmp_path, FIXED), given, str(out), *force], capsys)
    assert Path(given).read_bytes() == before


def test_an_output_that_exists_is_overwritten_only_by_force(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    stated, given, out = preset(tmp_path, FIXED), source(tmp_path), tmp_path / "out.wav"
    out.write_text("precious")
    assert "this file exists" in refused([stated, given, str(out)], capsys)
    assert out.read_text() == "precious"
    assert main(["render", stated, given, str(out), "--force"]) == 0
    assert probe(out).frames == 20000


@pytest.mark.parametrize(
    ("arguments", "reason"),
    [
        (["{preset}", "{folder}/none.wav", "{folder}/out.wav"], "there is no such file"),
        (
            ["nonesuch", "{in}", "{folder}/out.wav"],
            "nonesuch: there is no such file, and no shipped preset of this name",
        ),
        (["{preset}", "{preset}", "{folder}/out.wav"], "this is no audio file"),
        (["{preset}", "{in}", "{folder}/none/out.wav"], "does not exist"),
        (["{preset}", "{in}", "{folder}/out.mp3"], 'not written as ".mp3"'),
        (["{preset}", "{in}", "{folder}/out.flac", "--subtype", "pcm32"], "a FLAC file does not hold pcm32 samples"),
        (["{preset}", "{in}", "{folder}/out.wav", "--subtype", "pcm8"], "'pcm8' is not one of 'pcm16', 'pcm24'"),
        (["{preset}", "{in}"], "Missing argument 'OUT'"),
    ],
)
def test_requests_that_cannot_be_are_refused_and_leave_nothing(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], arguments: list[str], reason: str
) -> None:
    places = {"preset": preset(tmp_path, FIXED), "in": source(tmp_path, 100), "folder": str(tmp_path)}
    before = sorted(tmp_path.iterdir())
    assert reason in refused([argument.format(**places) for argument in arguments], capsys)
    assert sorted(tmp_path.iterdir()) == before


def test_nan_in_the_input_is_refused_by_its_frame(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    samples = np.zeros((30000, 1))
    samples[20001] = np.nan
    soundfile.write(tmp_path / "in.wav", samples, 48000, subtype="FLOAT")
    out = tmp_path / "out.wav"
    assert "frame 20001, channel 1 is nan" in refused(
        [preset(tmp_path, FIXED), str(tmp_path / "in.wav"), str(out)], capsys
    )
    assert sorted(file.name for file in tmp_path.iterdir()) == ["in.wav", "preset.toml"]


def test_an_output_that_runs_away_is_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    stated = preset(tmp_path, 'arithmetic = "float32"', "b = [1.0]\na = [1.0, -3.0]")
    Path(stated).write_text("allow_unstable = true\n" + Path(stated).read_text())
    given = source(tmp_path, 1000)
    said = refused([stated, given, str(tmp_path / "out.wav")], capsys)
    assert f"the output of {stated} is no longer finite before frame 1000" in said
    assert sorted(file.name for file in tmp_path.iterdir()) == ["in.wav", "preset.toml"]


def test_of_several_outputs_all_are_written_or_none(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    stated, given = preset(tmp_path, FIXED, CROSSOVER), source(tmp_path)
    (tmp_path / "out-high.wav").write_text("mine")
    said = refused([stated, given, str(tmp_path / "out.wav")], capsys)
    assert f"{tmp_path / 'out-high.wav'}: this file exists" in said
    assert sorted(path.name for path in tmp_path.iterdir()) == ["in.wav", "out-high.wav", "preset.toml"]
    assert (tmp_path / "out-high.wav").read_text() == "mine"


def test_a_file_that_cannot_appear_takes_those_before_it_along(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """The files appear one after the other at the end: here the disk fails at the second."""
    stated, given = preset(tmp_path, FIXED, CROSSOVER), source(tmp_path)
    place, appeared = atomic._place_new, []

    def fails_at_the_second(partial: Path, target: Path) -> None:
        if appeared:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
        place(partial, target)
        appeared.append(target)

    monkeypatch.setattr(atomic, "_place_new", fails_at_the_second)
    assert main(["render", stated, given, str(tmp_path / "out.wav")]) == 3
    assert len(appeared) == 1
    assert sorted(path.name for path in tmp_path.iterdir()) == ["in.wav", "preset.toml"]


def test_an_output_may_not_be_the_input(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    stated, given = preset(tmp_path, FIXED, CROSSOVER), source(tmp_path, name="in-low.wav")
    said = refused([stated, given, str(tmp_path / "in.wav"), "--force"], capsys)
    assert f"{given}: input and output are the same file" in said


def test_a_disk_without_room_is_the_machines_failure(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    stated, given = preset(tmp_path, FIXED), source(tmp_path)
    assert main(["render", stated, given, str(tmp_path / "first.wav")]) == 0  # so that the kernel need not be written
    capsys.readouterr()
    with file_size_limit(30000):
        said = refused([stated, given, str(tmp_path / "out.wav")], capsys, status=3)
    assert "out.wav: cannot write this file: File too large" in said
    assert sorted(file.name for file in tmp_path.iterdir()) == ["first.wav", "in.wav", "preset.toml"]


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM, signal.SIGHUP])
@pytest.mark.parametrize("there", [False, True])
def test_an_end_by_signal_leaves_nothing_half_written(tmp_path: Path, there: bool, number: signal.Signals) -> None:
    """Of a whole process that is stopped in the middle of its work: the partial file is there, the output is not."""
    given = source(tmp_path, 48000 * 60, 8)
    out = tmp_path / "out.wav"
    if there:
        out.write_text("precious")
    command = [
        sys.executable,
        "-m",
        "streamhost.commands.main",
        "render",
        preset(tmp_path, FIXED),
        given,
        str(out),
        "--force",
    ]
    process = subprocess.Popen(
        command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, cwd=Path(sh.__file__).parents[1]
    )
    partial = tmp_path / f".out.wav.partial-{process.pid}"
    while process.poll() is None and not (partial.exists() and partial.stat().st_size > 100_000):
        time.sleep(0.001)
    os.kill(process.pid, number)
    said, told = process.communicate()
    assert (process.returncode, said) == (130, "")
    assert told.endswith("Interrupted.\n")
    assert "Traceback" not in told
    left = ["in.wav", "out.wav", "preset.toml"] if there else ["in.wav", "preset.toml"]
    assert sorted(file.name for file in tmp_path.iterdir()) == left
    if there:
        assert out.read_text() == "precious"
