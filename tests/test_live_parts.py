"""What serves the sound card and needs none: messages, memory, the missing library, the caution, keys."""

import os
import pickle
import sys
import time
from dataclasses import dataclass, field
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from streamhost.commands.listening.caution import acknowledge
from streamhost.commands.listening.terminal import press
from streamhost.errors import MachineError, RequestError
from streamhost.host import Change, Lane
from streamhost.host.carrying import POINTERS
from streamhost.host.records import MOST_LANES
from streamhost.live import portaudio
from streamhost.live.controls import Controls, planned, planned_in_order
from streamhost.live.files import Built, Files, Taken
from streamhost.live.memory import Memory, mapped
from streamhost.live.recipe import LaneAsked
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_presets
from streamhost.shipped import resolve


@pytest.fixture(scope="module")
def lanes() -> list[Lane]:
    names = ("rumble-float32", "rumble-double-state")
    return [Lane(each, 1) for each in realize_presets([load_preset(resolve(name, "preset")) for name in names], 1)]


def test_a_carried_state_points_to_its_own_arrays_where_it_arrives(lanes: list[Lane]) -> None:
    sent = planned(Change(0, 1, "carry"), 0, lanes)
    got = pickle.loads(pickle.dumps(sent))
    assert (got.change, got.before) == (sent.change, 0)
    assert sent.prepared is not None
    assert [int(got.prepared.record[name][0]) for name in POINTERS] == [each.ctypes.data for each in got.prepared.arrays]
    for there, here in zip(got.prepared.arrays, sent.prepared.arrays, strict=True):
        assert np.array_equal(there, here)
        assert there.ctypes.data != here.ctypes.data or not here.size
    kept = [name for name in sent.prepared.record.dtype.names if name not in POINTERS]
    assert sent.prepared.record[kept] == got.prepared.record[kept]


def test_changes_are_prepared_for_the_lane_that_is_heard_before_them(lanes: list[Lane]) -> None:
    found = planned_in_order([Change(20, 1, "warm"), Change(10, 1, "carry"), Change(30, 0, "carry")], lanes)
    assert [(each.change.frame, each.before, each.prepared is not None) for each in found] == [
        (10, 0, True), (20, 1, False), (30, 1, True)]


def test_two_mappings_are_one_memory() -> None:
    memory = Memory()
    here = memory.mapped(5000)
    there = mapped(memory.handle, 5000)
    assert here[:] == bytes(5000)
    here[4999:5000] = b"x"
    assert there[4999:5000] == b"x"
    memory.close()


def test_a_missing_library_is_told_with_the_remedy(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    (tmp_path / "sounddevice.py").write_text("raise OSError('PortAudio library not found')\n")
    monkeypatch.syspath_prepend(tmp_path)
    monkeypatch.delitem(sys.modules, "sounddevice", raising=False)
    with pytest.raises(MachineError, match=r"apt install libportaudio2.*--no-device"):
        portaudio.Stream(portaudio.Wanted(48000.0, 128, 2), 0, 0)


@pytest.mark.parametrize(
    ("outputs", "said"),
    [([], r"There is no sound card to play on\. .*--no-device"), ([2], r'sound card "card" at 48000 Hz with 2 channels')],
)
def test_a_card_that_cannot_be_opened_is_told(outputs: list[int], said: str, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(**parameters: Any) -> None:
        raise ValueError("No output device\nmatching")

    package = SimpleNamespace(query_devices=lambda: [{"max_output_channels": each} for each in outputs],
                              RawOutputStream=refuse)
    monkeypatch.setattr(portaudio, "library", lambda: package)
    with pytest.raises(MachineError, match=said):
        portaudio.Stream(portaudio.Wanted(48000.0, 128, 2, device="card"), 0, 0)


def test_the_private_part_of_the_package_is_not_needed() -> None:
    """Without its base class the stream is opened with a Python callback."""
    given: dict[str, Any] = {}
    package = SimpleNamespace(RawStream=lambda **parameters: given.update(parameters) or "stream")
    stream, callback = portaudio._open(package, portaudio.Wanted(48000.0, 64, 2, 1, "card", "other"), 1, 2)
    assert (stream, callback) == ("stream", "python")
    assert (given["device"], given["channels"], given["blocksize"]) == (("other", "card"), (1, 2), 64)
    assert given["dither_off"] is True


def test_the_caution_is_read_once(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    asked: list[str] = []
    monkeypatch.setattr("click.prompt", lambda text, **options: asked.append(text))
    with pytest.raises(RequestError, match="--volume-is-down"):
        acknowledge(given=False, attended=False)
    acknowledge(given=True, attended=False)
    assert asked == []
    acknowledge(given=False, attended=True)
    assert asked == ["Volume is down: begin, muted? Enter"]
    assert capsys.readouterr().out.startswith("Sound can hurt.")
    acknowledge(given=False, attended=True)
    acknowledge(given=False, attended=False)
    assert len(asked) == 1
    (tmp_path / "streamhost" / "caution").write_text("of another text\n")
    acknowledge(given=False, attended=True)
    assert len(asked) == 2


@dataclass
class FakeCard:
    done: list[tuple[Any, ...]] = field(default_factory=list)
    answers: dict[int, str | None] = field(default_factory=dict)

    def __getattr__(self, name: str) -> Any:
        def note(*arguments: Any) -> int:
            self.done.append((name, *arguments))
            self.answers[len(self.answers) + 1] = None
            return len(self.answers)

        return note

    def tend(self) -> list[str]:
        return []

    def answer(self, ticket: int) -> str | None:
        return self.answers[ticket]


def test_keys_do_what_they_say(lanes: list[Lane]) -> None:
    card = FakeCard()
    controls = Controls(card, [*lanes, *lanes])  # type: ignore[arg-type]
    for key in "2":
        press(controls, key)
    (name, change), = card.done
    assert (name, change.change, change.before) == ("change", Change(0, 1, "carry"), 0)
    card.done.clear()
    for key in "hb dD>><d-uu0q\t":
        press(controls, key)
    assert [each if each[0] != "change" else each[1].change for each in card.done] == [
        Change(0, 0, "warm"), ("mute",), ("subtract", "ideal", 0.0), ("subtract", 1, 0.0), ("subtract", 1, 6.0),
        ("subtract", 1, 12.0), ("subtract", 1, 6.0), ("subtract", None, 6.0), ("set_monitor", -1.0), ("come_up",), ("come_up",)]
    assert controls.notice == "There is no lane 10."


def test_a_change_that_is_refused_leaves_the_lane_that_was_heard(lanes: list[Lane]) -> None:
    card = FakeCard()
    controls = Controls(card, lanes, changeover="keep")  # type: ignore[arg-type]
    controls.hear(1)
    assert controls.chosen == 1
    card.answers[1] = "the two differ"
    controls.tend()
    assert (controls.chosen, controls.before, controls.notice) == (0, 0, "the two differ")


def test_a_lane_that_is_built_anew_takes_turns_between_two_slots(lanes: list[Lane]) -> None:
    card = FakeCard()
    controls = Controls(card, list(lanes))  # type: ignore[arg-type]
    asked = LaneAsked(lanes[0].realization)
    for slot, place in ((2, None), (0, 0), (2, 2)):  # the first time a slot more
        card.done.clear()
        controls.take_up(0, asked, lanes[0])
        (placed, change), = [card.done]
        assert placed == ("place", asked, place)
        assert (change[1].change.lane, controls.slots) == (slot, [slot, 1])
        assert controls.number_of(slot) == 0
    card.done.clear()
    controls.take_up(1, asked, lanes[0])  # not heard: nothing changes over
    assert [each[0] for each in card.done] == ["place"]
    assert controls.slots == [2, 3]
    card.answers = dict.fromkeys(card.answers, "")
    controls.tend()
    controls.take_up(0, asked, lanes[0])
    card.answers[max(card.answers)] = "no"
    controls.tend()
    assert (controls.slots, controls.notice) == ([2, 3], "no")


def test_there_is_an_end_of_places(lanes: list[Lane]) -> None:
    controls = Controls(FakeCard(), [lanes[0]] * MOST_LANES)  # type: ignore[arg-type]
    with pytest.raises(RequestError, match="All 16 places"):
        controls.take_up(0, LaneAsked(lanes[0].realization), lanes[0])
    wide = Lane(realize_presets([load_preset(resolve("rumble-float32", "preset"))], 2)[0], 2)
    with pytest.raises(RequestError, match="2 as its channels"):
        Controls(FakeCard(), lanes).take_up(0, LaneAsked(wide.realization), wide)  # type: ignore[arg-type]


def test_a_file_is_built_when_its_text_has_changed(tmp_path: Path, lanes: list[Lane]) -> None:
    preset = load_preset(resolve("rumble-float32", "preset"))
    good, other = tmp_path / "good.toml", tmp_path / "other.toml"
    for file in (good, other):
        file.write_text("1")
    now = [0.0]

    def build(path: Path) -> list[Taken]:
        if path.read_text() == "bad":
            raise RequestError("it is bad")
        return [Taken(preset, LaneAsked(lanes[0].realization), lanes[0])] * len(path.read_text())

    def after(text: str) -> list[Built]:
        good.write_text(text)
        found: list[Built] = []
        for _ in range(100):
            now[0] += 1.0
            found += files.tend()
            time.sleep(0.002)
            if found:
                break
        return found

    with Files({good: [0, 2], other: [1]}, build, clock=lambda: now[0]) as files:
        assert files.tend() == []
        (built,) = after("22")
        assert (built.path, built.numbers, len(built.lanes), built.problem) == (good, (0, 2), 2, "")
        (built,) = after("bad")
        assert (built.lanes, built.problem) == ((), "it is bad")
        assert after("333")[0].problem == "good.toml makes 3 lanes now, and 2 run."
        good.unlink()  # as an editor may do before it writes the file anew
        now[0] += 1.0
        assert files.tend() == []
        assert len(after("44")) == 1
        os.utime(good, (1, 1))  # the same text again
        now[0] += 1.0
        assert files.tend() == []
        assert not files._under_way
