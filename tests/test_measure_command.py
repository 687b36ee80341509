"""`streamhost measure`: one realization, its instruments, its limits."""

import io
import json
from dataclasses import dataclass, field, replace
from types import SimpleNamespace

import numpy as np
import pytest

from streamhost import load_preset
from streamhost.commands import instruments as registry
from streamhost.commands.common import Progress
from streamhost.commands.documents import document_of
from streamhost.commands.instruments import INSTRUMENTS, Instrument, limit_verdicts
from streamhost.commands.main import main
from streamhost.commands.measuring.wave import Wave
from streamhost.files import AudioWriter, read_all
from streamhost.measure import LIMITS
from streamhost.presets.realizing import realize_preset
from streamhost.presets.tables import LimitsTable, names
from streamhost.signals import white

GAIN = """
title = "A gain"
rate = 8000

[[filter]]
b = [0.2871]

[structure]
form = "direct-1"

[format]
signal = "Q1.15"
"""


@dataclass(frozen=True)
class Told:
    """A result of an instrument that is not there."""

    found_lsb: float
    trace: np.ndarray = field(metadata={"curve": True}, compare=False, repr=False)
    complete: bool = True


def told(asked):
    return Told(3.0, asked.x[:4])


def lines(result):
    yield f"Found {result.found_lsb:g} LSB."


@pytest.fixture
def gain(tmp_path):
    """Writes a preset of one multiplication, with limits, and gives its name."""

    def write(limits=""):
        path = tmp_path / "gain.toml"
        path.write_text(GAIN + (f"\n[limits]\n{limits}\n" if limits else ""), encoding="utf-8")
        return str(path)

    return write


@pytest.fixture
def only(monkeypatch):
    """Puts instruments in the place of those that there are."""

    def put(*instruments):
        for module in ("instruments", "measure_run", "measure_text"):
            monkeypatch.setattr(f"streamhost.commands.{module}.INSTRUMENTS", instruments)

    return put


def document(capsys, *arguments, status=0):
    assert main(["measure", *arguments, "--json", "-"]) == status
    return json.loads(capsys.readouterr().out)


def test_the_help_names_the_instruments(capsys):
    assert main(["measure", "--help"]) == 0
    said = " ".join(capsys.readouterr().out.split())
    assert f"There are {', '.join(instrument.name for instrument in INSTRUMENTS)}." in said


def test_all_instruments_from_end_to_end(gain, tmp_path, capsys):
    figures = tmp_path / "figures.json"
    assert main(["measure", gain("noise_dbfs = -90.0"), "--json", str(figures)]) == 0
    shown = capsys.readouterr().out
    found = json.loads(figures.read_text(encoding="utf-8"))
    assert [name for name in found if name in {each.name for each in INSTRUMENTS}] == [each.name for each in INSTRUMENTS]
    for instrument in INSTRUMENTS:
        assert f"\n{instrument.name}:\n" in shown
    assert "Meets its limit." in shown
    # A product of a 16-bit word, rounded to a step q: q^2 / 12 (Bennett 1948), +3.01 dB; the band is 3980 of 4000 Hz.
    expected = 10 * np.log10(2.0**-30 / 12 * 2 * 3980 / 4000)
    assert found["noise"]["measured_dbfs"] == pytest.approx(expected, abs=3 * found["noise"]["measured_interval_db"])
    assert found["noise"]["predicted_dbfs"] == pytest.approx(expected, abs=0.001)  # the bits that are dropped are finite
    # one coefficient, 0.2871, in 16 bits at the point that it allows
    stored = float(realize_preset(load_preset(gain())).program.diagram.values[0, 0])
    assert found["response"]["deviation_db"] == pytest.approx(abs(20 * np.log10(stored / 0.2871)), rel=1e-6)
    assert (found["seed"], found["input"], found["broken_off"]) == (1, None, [])


def test_the_same_command_gives_the_same_figures(gain, capsys):
    name = gain("noise_dbfs = -90.0")
    assert document(capsys, name, "--only", "noise") == document(capsys, name, "--only", "noise")


def test_a_miss_says_what_was_measured_beside_what_is_allowed(gain, capsys):
    name = gain("noise_dbfs = -120.0\nmultiplications = 0\nmemory_words = 0")
    assert main(["measure", name, "--only", "noise"]) == 1
    shown = capsys.readouterr().out
    assert "Meets 1 of 3 limits." in shown
    assert "Misses noise_dbfs: −98.1, at most −120 dBFS." in shown
    assert "Misses multiplications: 1, at most 0." in shown
    found = document(capsys, name, "--only", "noise", status=1)["limits"]
    assert found["met"] is False
    assert [(each["key"], each["meets"]) for each in found["verdicts"]] == [
        ("noise_dbfs", False), ("multiplications", False), ("memory_words", True)]


def test_limits_are_checked_on_their_own_signal_whatever_the_input_is(gain, tmp_path, capsys):
    recording = tmp_path / "loud.wav"
    with AudioWriter(recording, rate=8000, channels=2, subtype="pcm24") as writer:
        writer.write(white(8000, 2, 7, 0.0))
    name = gain("noise_dbfs = -97.0")
    own = document(capsys, name, "--only", "noise")
    given = document(capsys, name, "--only", "noise", "--input", str(recording))
    assert own["limits"] == given["limits"]
    assert own["noise"]["measured_dbfs"] != given["noise"]["measured_dbfs"]
    preset = load_preset(name)
    assert limit_verdicts(preset, realize_preset(preset))[0].found == own["limits"]["verdicts"][0]["found"]


@pytest.mark.parametrize(("judges", "runs"), [(True, 1), (False, 2)])
def test_a_quick_run_is_good_for_limits_only_where_it_gives_the_same_figures(judges, runs, gain, only, monkeypatch):
    """The limit on noise, with another instrument in its place."""
    asked_for = []

    def run(asked):
        asked_for.append(asked.quick)
        return SimpleNamespace(each=[SimpleNamespace(measured_dbfs=-100.0, reason="", output="")])

    only(Instrument("noise", run, lambda result: iter(()), quick_judges=judges))
    monkeypatch.setattr("streamhost.commands.measure_text.document_of", lambda result: None)
    assert main(["measure", gain("noise_dbfs = -90.0"), "--quick"]) == 0
    assert asked_for == [True, False][:runs]


def test_limits_of_instruments_that_do_not_run_are_not_asked(gain, capsys):
    name = gain("noise_dbfs = -120.0")
    assert main(["measure", name, "--only", "response"]) == 0
    assert "Not asked: noise_dbfs." in capsys.readouterr().out


def test_every_limit_is_a_key_of_a_preset_and_its_instrument_exists():
    assert {limit.key for limit in LIMITS} == set(names(LimitsTable)) - {
        "band_hz", "mask_hz", "changeover", "changeover_ms"}
    assert {limit.instrument for limit in LIMITS} <= {"", *(instrument.name for instrument in INSTRUMENTS)}


def test_every_instrument_is_a_function_of_the_package():
    import streamhost

    functions = {"float": "float_particulars"}
    for instrument in INSTRUMENTS:
        assert callable(getattr(streamhost.measure, functions.get(instrument.name, instrument.name)))


@pytest.mark.parametrize(("arguments", "said"), [
    (["--only", "nose"], '--only nose: there is no instrument "nose": response, '),
    (["--only", "nose"], 'Did you mean "noise"?'),
    (["--vary", "filter.b=[1.0],[0.5]"], "with --vary is 2 realizations, and measure takes one"),
    (["--json", "/nowhere/figures.json"], "the folder /nowhere does not exist"),
    (["--output", "/nowhere/at/all"], "the folder /nowhere/at does not exist"),
])
def test_what_cannot_be_done_is_refused_before_the_work(arguments, said, gain, capsys):
    assert main(["measure", gain(), *arguments]) == 2
    assert said in capsys.readouterr().err


def test_one_variant_may_be_named(gain, capsys):
    found = document(capsys, gain(), "--vary", "filter.b=[0.5]", "--only", "response")
    assert found["title"] == "A gain, b [0.5]"
    assert found["response"]["deviation_db"] == 0.0


# What is broken off


def broken(asked):
    raise KeyboardInterrupt


def test_what_is_done_stays_when_the_rest_is_broken_off(gain, only, tmp_path, capsys):
    figures = tmp_path / "figures.json"
    only(Instrument("first", told, lines), Instrument("second", broken, lines), Instrument("third", told, lines))
    assert main(["measure", gain("noise_dbfs = -90.0\nmultiplications = 1"), "--json", str(figures)]) == 130
    shown = capsys.readouterr().out
    assert "first:\nFound 3 LSB." in shown
    assert "Broken off: second, third." in shown
    assert "Not asked: noise_dbfs." in shown
    found = json.loads(figures.read_text(encoding="utf-8"))
    assert found["first"] == {"found_lsb": 3.0, "complete": True}
    assert found["broken_off"] == ["second", "third"]
    assert found["limits"]["met"] is True
    assert "third" not in found


def test_an_instrument_that_was_broken_off_itself_is_told_in_part(gain, only, capsys):
    only(Instrument("first", lambda asked: replace(told(asked), complete=False), lines), Instrument("second", told, lines))
    found = document(capsys, gain(), status=130)
    assert found["first"]["complete"] is False
    assert found["broken_off"] == ["first", "second"]


# Audio


def test_audio_that_is_found_is_written_whole_and_not_over_what_is_there(gain, only, tmp_path, capsys):
    folder = tmp_path / "worst"
    samples = np.array([[1.0], [-1.0], [0.25]])
    only(Instrument("first", told, lines, waves=lambda result: iter([Wave("register-y", samples)])))
    found = document(capsys, gain(), "--output", str(folder))
    (path,) = folder.iterdir()
    assert found["files"] == [str(path)] == [str(folder / "gain-first-register-y.wav")]
    assert np.array_equal(read_all(path)[0], samples)
    assert main(["measure", gain(), "--output", str(folder)]) == 2
    assert "this file exists" in capsys.readouterr().err
    assert main(["measure", gain(), "--output", str(folder), "--force"]) == 0


# Documents and progress


def test_a_document_has_every_field_but_curves():
    @dataclass(frozen=True)
    class Inner:
        l1: float

    @dataclass(frozen=True)
    class Outer:
        registers: tuple[Inner, ...]
        h: np.ndarray = field(metadata={"curve": True})
        count: int = 0
        reason: str | None = None

    result = Outer((Inner(float("inf")), Inner(np.float64(2.0))), np.zeros(3), np.int64(7))
    assert document_of(result) == {"registers": [{"l1": float("inf")}, {"l1": 2.0}], "count": 7, "reason": None}
    with pytest.raises(AssertionError, match="ndarray"):
        document_of({"h": np.zeros(2)})


def test_progress_within_an_item_moves_the_estimate():
    stream, now = io.StringIO(), SimpleNamespace(time=0.0)
    stream.isatty = lambda: True
    progress = Progress("measure", 2, [1.0, 3.0], stream=stream, clock=lambda: now.time)
    progress.step("noise")
    now.time = 10.0
    progress.step("overflow")
    progress.within(1 / 3, "y")
    shown = [line.rstrip("\x1b[K") for line in stream.getvalue().split("\r")[1:]]
    assert shown == [
        "measure  1 of 2  noise", "measure  2 of 2  overflow   30 s left", "measure  2 of 2  overflow  y   10 s left"]


def test_the_registry_is_one_line_an_instrument():
    assert len({instrument.name for instrument in registry.INSTRUMENTS}) == len(registry.INSTRUMENTS)
