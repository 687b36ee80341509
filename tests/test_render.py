"""`streamhost render`: the realization's output is written to the bit, and what happened is told."""

import tracemalloc
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from audio_files import wav_bytes, wav_codes, write
from render_files import CROSSOVER, FIXED, expected, preset, source

import streamhost as sh
from streamhost import shipped
from streamhost.commands.main import main
from streamhost.commands.render import _minute_by_minute, summary
from streamhost.files import probe, read_all
from streamhost.host.rendering import Rendered, Written, default_subtype, render_file
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_preset

# What is written


@pytest.mark.parametrize("channels", [1, 2, 5])
@pytest.mark.parametrize(
    ("format", "bits"),
    [
        (FIXED, 16),
        ('arithmetic = "24x24+56"', 24),
        ('arithmetic = "32x32+64"', 32),
        ('arithmetic = "float32"', 24),
        ('arithmetic = "float64"', 24),
    ],
)
def test_the_file_holds_the_realizations_output_to_the_bit(
    tmp_path: Path, format: str, bits: int, channels: int
) -> None:
    stated, given, out = preset(tmp_path, format), source(tmp_path, channels=channels), tmp_path / "out.wav"
    assert main(["render", stated, given, str(out)]) == 0
    nearest = np.rint(expected(stated, given) * 2.0 ** (bits - 1))
    top = 2 ** (bits - 1)
    assert wav_codes(out) == np.clip(nearest, -top, top - 1).astype(np.int64).ravel().tolist()
    info = probe(out)
    assert (info.rate, info.channels, info.frames, info.subtype) == (48000, channels, 20000, f"PCM_{bits}")


def test_fixed_point_goes_from_codes_to_codes_without_a_change(tmp_path: Path) -> None:
    stated, given, out = preset(tmp_path, FIXED), source(tmp_path), tmp_path / "out.wav"
    assert main(["render", stated, given, str(out)]) == 0
    codes = np.array(wav_codes(Path(given))).reshape(-1, 2)
    assert wav_codes(out) == realize_preset(load_preset(stated)).process_codes(codes).ravel().tolist()


@pytest.mark.parametrize(
    ("subtype", "name", "kept"),
    [("pcm16", "PCM_16", 15), ("pcm24", "PCM_24", 23), ("pcm32", "PCM_32", 31), ("float", "FLOAT", None)],
)
def test_a_subtype_is_taken_as_said(tmp_path: Path, subtype: str, name: str, kept: int | None) -> None:
    stated, given, out = preset(tmp_path, 'arithmetic = "float64"'), source(tmp_path), tmp_path / "out.wav"
    assert main(["render", stated, given, str(out), "--subtype", subtype]) == 0
    y, back = expected(stated, given), read_all(out)[0]
    assert probe(out).subtype == name
    assert np.array_equal(back, y.astype(np.float32) if kept is None else np.rint(y * 2.0**kept) / 2.0**kept)


@pytest.mark.parametrize("name", ["out.rf64", "out.flac", "OUT.WAV"])
def test_other_containers_hold_the_same(tmp_path: Path, name: str) -> None:
    stated, given = preset(tmp_path, FIXED), source(tmp_path)
    assert main(["render", stated, given, str(tmp_path / name)]) == 0
    assert np.array_equal(read_all(tmp_path / name)[0], expected(stated, given))


@pytest.mark.parametrize(
    ("output", "subtype"),
    [
        ("Q1.7", "pcm16"),
        ("Q1.15", "pcm16"),
        ("Q4.12", "pcm16"),
        ("Q2.15", "pcm16"),
        ("Q1.16", "pcm24"),
        ("Q1.23", "pcm24"),
        ("Q9.23", "pcm24"),
        ("Q1.24", "pcm32"),
        ("Q1.31", "pcm32"),
    ],
)
def test_unless_said_the_shortest_pcm_that_holds_the_outputs_fraction(output: str, subtype: str) -> None:
    assert default_subtype(sh.Fixed("Q1.15", output=output)) == subtype


@pytest.mark.parametrize("format", [sh.Float("float32"), sh.Float("float64")])
def test_floats_are_written_in_24_bits(format: sh.Float) -> None:
    assert default_subtype(format) == "pcm24"


def test_several_outputs_have_a_file_each(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    stated, given = preset(tmp_path, FIXED, CROSSOVER), source(tmp_path)
    assert main(["render", stated, given, str(tmp_path / "out.wav")]) == 0
    said = capsys.readouterr().out.splitlines()
    wanted = expected(stated, given)
    for output, name in enumerate(("low", "high")):
        path = tmp_path / f"out-{name}.wav"
        assert said[output].startswith(f"{path}: 20000 frames (0.42 s), 2 channels, 48000 Hz, WAV pcm16")
        assert np.array_equal(read_all(path)[0], wanted[:, output])
    assert said[2].startswith("peak")
    assert not (tmp_path / "out.wav").exists()


def test_a_shipped_preset_on_a_shipped_recording(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["render", "rumble-double-state", "plucked", str(tmp_path / "out.wav")]) == 0
    y = expected(str(shipped.folder("preset") / "rumble-double-state.toml"), str(shipped.folder("sample") / "plucked.wav"))
    assert np.array_equal(read_all(tmp_path / "out.wav")[0], y)
    said = capsys.readouterr().out
    assert f"{len(y)} frames" in said
    assert "unstable" not in said


def test_the_same_command_writes_the_same_bytes(tmp_path: Path) -> None:
    stated, given = preset(tmp_path, 'arithmetic = "float32"'), source(tmp_path)
    for name in ("a.wav", "b.wav"):
        assert main(["render", stated, given, str(tmp_path / name)]) == 0
    assert (tmp_path / "a.wav").read_bytes() == (tmp_path / "b.wav").read_bytes()


def test_memory_does_not_grow_with_the_file(tmp_path: Path) -> None:
    realization = sh.realize(sh.design("peak", rate=48000, frequency=1000.0, gain_db=6.0, q=0.7), format="float32")
    source(tmp_path, 40000, name="short.wav"), source(tmp_path, 400000, name="long.wav")
    peaks = {}
    for name in ("short.wav", "short.wav", "long.wav"):  # the first run loads what stays
        info = probe(tmp_path / name)
        tracemalloc.start()
        render_file(realization, info, tmp_path / "out.wav", overwrite=True)
        peaks[name] = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
    # Ten times the frames are 5.8 MB more as float64; a tenth of a block is allowed for what Python keeps meanwhile.
    assert peaks["long.wav"] < peaks["short.wav"] + 16384 * 2 * 8 / 10


# What is said


def test_the_summary_counts_what_happened(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    gain = "b = [1.5]\na = [1.0]"
    given = tmp_path / "in.wav"
    given.write_bytes(wav_bytes([16384, 30000, -30000, 100, -26000, 0], 16))
    out = tmp_path / "out.wav"
    assert main(["render", preset(tmp_path, FIXED, gain), str(given), str(out)]) == 0
    assert capsys.readouterr().out == (
        f"{out}: 6 frames (0.00 s), 1 channel, 48000 Hz, WAV pcm16\n"
        "peak 0.00 dBFS, 0 samples clipped, no NaN\n"
        "3 saturations\n"
    )
    roomy = 'signal = "Q2.14"\ncoefficients = "Q2.14"\ninput = "Q1.15"'
    assert main(["render", preset(tmp_path, roomy, gain), str(given), str(out), "--force"]) == 0
    said = capsys.readouterr().out.splitlines()
    assert said[1:] == ["peak 2.76 dBFS, 3 samples clipped, no NaN"]  # 1.5 * 30000 / 32768 = 1.373
    assert wav_codes(out) == [24576, 32767, -32768, 150, -32768, 0]


def test_wraps_are_counted_by_their_name(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    given = tmp_path / "in.wav"
    given.write_bytes(wav_bytes([30000, 100], 16))
    stated = preset(tmp_path, FIXED + '\noverflow = "wrap"', "b = [1.5]\na = [1.0]")
    assert main(["render", stated, str(given), str(tmp_path / "out.wav")]) == 0
    assert capsys.readouterr().out.endswith("no NaN\n1 wrap\n")
    assert wav_codes(tmp_path / "out.wav") == [45000 - 65536, 150]


def test_silence_has_no_level(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write(tmp_path / "in.wav", np.zeros((10, 1)))
    assert main(["render", preset(tmp_path, FIXED), str(tmp_path / "in.wav"), str(tmp_path / "out.wav")]) == 0
    assert "peak silence, 0 samples clipped" in capsys.readouterr().out


def test_a_filter_that_rounding_made_unstable_is_run_and_said(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    given = source(tmp_path)
    assert main(["render", "rumble-naive-16-bit", given, str(tmp_path / "out.wav")]) == 0
    said = capsys.readouterr().out
    assert "unstable with its coefficients rounded: 1 pole lies on or outside the unit circle\n" in said


def test_a_filter_that_is_unstable_as_asked_says_so(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    integrator = preset(tmp_path, FIXED, "b = [0.001]\na = [1.0, -1.0]")
    given = source(tmp_path)
    assert main(["render", integrator, given, str(tmp_path / "out.wav")]) == 2
    assert "allow_unstable = true" in capsys.readouterr().err
    text = Path(integrator).read_text()
    Path(integrator).write_text("allow_unstable = true\n" + text)
    assert main(["render", integrator, given, str(tmp_path / "out.wav")]) == 0
    assert "unstable as asked: 1 pole lies on or outside the unit circle\n" in capsys.readouterr().out


def test_hazards_of_the_structure_are_said() -> None:
    filter = sh.design("butterworth", rate=48000, response="low-pass", order=8, frequency=100.0)
    realization = sh.realize(filter, form="direct-1", decomposition="whole")
    lane = SimpleNamespace(peak_dbfs=-3.25)
    file = Written(Path("a\x1b.wav"), "", 0)
    rendered = Rendered((file,), "WAV", "pcm24", 48000, 1, 1, lane, realization.tally())  # type: ignore[arg-type]
    lines = summary(rendered, realization)
    assert lines[0] == "a\N{REPLACEMENT CHARACTER}.wav: 1 frame (0.00 s), 1 channel, 48000 Hz, WAV pcm24"
    assert lines[1].startswith("peak \N{MINUS SIGN}3.25 dBFS")
    assert lines[-len(realization.built.hazards) :] == [f"hazard: {text}" for text in realization.built.hazards]
    assert any("order 8 is drawn undivided" in line for line in lines)


def test_progress_moves_on_with_every_minute_that_begins(tmp_path: Path) -> None:
    steps: list[str] = []
    progress, info = SimpleNamespace(step=steps.append), SimpleNamespace(rate=100, path=tmp_path / "in.wav")
    report = _minute_by_minute(progress, info)  # type: ignore[arg-type]
    begun = []
    for done in range(0, 9 * 6000 + 1, 16384):
        report(done)
        begun.append(len(steps))
    assert begun == [1, 3, 6, 9]  # at 100 Hz frames 0, 16384, 32768, 49152 lie in minutes 1, 3, 6 and 9
    assert set(steps) == {"minutes of in.wav"}


def test_a_render_reports_before_every_block(tmp_path: Path) -> None:
    realization, told = sh.realize(sh.Filter.from_coefficients([0.5], [1.0], rate=48000), form="direct-1"), []
    render_file(realization, probe(source(tmp_path, 40000)), tmp_path / "out.wav", report=told.append)
    assert told == [0, 16384, 32768]
