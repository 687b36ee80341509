"""`streamhost listen` on a virtual sound card, as a process of its own: what it writes, what its keys do, and how it ends."""

import contextlib
import json
import os
import pty
import select
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Self

import numpy as np
import pytest
from audio_files import write
from sound_server import RATE, SoundServer, counted, is_there

from streamhost.commands.main import main
from streamhost.files import read_all
from streamhost.shipped import resolve

pytestmark = pytest.mark.skipif(not is_there(), reason="no sound server here: apt install pulseaudio pulseaudio-utils")

COMMAND = [sys.executable, "-c", "import sys; from streamhost.commands.main import main; sys.exit(main())", "listen"]
PRESETS = ["rumble-float32", "rumble-double-state"]
CARD = ["--device", "vsink", "--latency-ms", "40"]
CHANGES = ["--change", "20000:2:carry", "--change", "30000:1:fade"]


@pytest.fixture(scope="module")
def server() -> Iterator[SoundServer]:
    with SoundServer() as server:
        yield server


def engine_of(process: int) -> int:
    """The child that is the engine."""
    until = time.monotonic() + 30.0
    while time.monotonic() < until:
        children = Path(f"/proc/{process}/task/{process}/children").read_text().split()
        for child in children:
            with contextlib.suppress(OSError):
                if b"live.start" in Path(f"/proc/{child}/cmdline").read_bytes():
                    return int(child)
        time.sleep(0.05)
    raise AssertionError("no engine was started")


def has_ended(process: int, seconds: float = 3.0) -> bool:
    until = time.monotonic() + seconds
    while Path(f"/proc/{process}").exists():
        if time.monotonic() > until:
            return False
        time.sleep(0.02)
    return True


def test_an_unattended_run_is_what_render_gives_to_the_bit(server: SoundServer, tmp_path: Path) -> None:
    given, exact, told = (tmp_path / name for name in ("in.wav", "exact.wav", "told.json"))
    write(given, np.random.default_rng(11).uniform(-0.2, 0.2, (3 * RATE, 1)))
    run = [*COMMAND, *PRESETS, *CARD, *CHANGES, "--input", str(given), "--seconds", "1", "--counter", "2", "--no-page",
           "--rise-db-per-s", "600", "--json", str(told), "--volume-is-down"]
    with server.ear() as ear:
        done = subprocess.run(run, env=server.environment, capture_output=True, text=True, timeout=60)
    assert (done.returncode, done.stderr) == (0, "")
    assert "Lane 2 is heard from frame 20000 on, by carry." in done.stdout
    assert main(["render", PRESETS[0], str(given), str(exact), "--lane", PRESETS[1], *CHANGES, "--subtype", "float"]) == 0
    count, sound = counted(ear.heard)
    up = count > 10000
    assert np.array_equal(np.diff(count), np.ones(len(count) - 1))
    assert count[-1] > RATE - 4096
    assert np.array_equal(sound[up], read_all(exact)[0][count[up], 0].astype(np.float32))
    figures = json.loads(told.read_text())
    assert (figures["callback"], figures["block_frames"]) == ("compiled", 128)
    assert RATE <= figures["frames"] == 128 * figures["blocks"] <= 2.5 * RATE
    assert 0 < figures["step_p50_us"] <= figures["step_p999_us"] <= figures["step_max_us"]
    assert [(each["frame"], each["lane"]) for each in figures["changes"]] == [(20000, 2), (30000, 1)]
    assert (figures["card"]["device"], figures["card"]["losses"]) == ("vsink", [])
    assert len({lane["state_sha256"] for lane in figures["lanes"]}) == 2


@pytest.mark.parametrize(("number", "status"), [(signal.SIGTERM, 130), (signal.SIGKILL, -9)])
def test_the_engine_ends_with_its_program(server: SoundServer, tmp_path: Path, number: int, status: int) -> None:
    told = tmp_path / "told.json"
    run = subprocess.Popen([*COMMAND, PRESETS[0], *CARD, "--seconds", "60", "--volume-is-down", "--json", str(told)],
                           env=server.environment, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
    try:
        engine = engine_of(run.pid)
        time.sleep(1.0 if number == signal.SIGTERM else 0.0)  # at work, and still beginning
        run.send_signal(number)
        _, said = run.communicate(timeout=5)
    finally:
        run.kill()
    assert run.returncode == status
    assert said == ("Interrupted.\n" if number == signal.SIGTERM else "")
    assert has_ended(engine)
    assert not told.exists()


class Terminal:
    """The program on a terminal of the test's, for as long as the context lasts at most."""

    def __init__(self, arguments: list[str], environment: dict[str, str]) -> None:
        self.process, self.handle = pty.fork()
        if self.process == 0:
            os.execve(COMMAND[0], [*COMMAND, *arguments], {**environment, "COLUMNS": "140", "LINES": "40"})
        self.text = ""
        self.status: int | None = None

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *unused: object) -> None:
        if self.status is None:
            os.kill(self.process, signal.SIGKILL)
            self.wait()

    def wait(self) -> int:
        """For its end; its exit status."""
        self.status = os.waitstatus_to_exitcode(os.waitpid(self.process, 0)[1])
        return self.status

    def wait_for(self, text: str, seconds: float = 40.0) -> None:
        """Until it stands on the page as last drawn."""
        until = time.monotonic() + seconds
        while text not in self.text:
            assert time.monotonic() < until, f"{text!r} does not come; there stands {self.text[-3000:]!r}"
            if select.select([self.handle], [], [], 0.1)[0]:
                self.text += os.read(self.handle, 1 << 16).decode(errors="replace")
                self.text = self.text[max(self.text.rfind("\x1b[H"), 0) :]

    def press(self, keys: str) -> None:
        os.write(self.handle, keys.encode())


def test_keys_a_file_that_is_saved_and_a_terminal_that_is_closed(server: SoundServer, tmp_path: Path) -> None:
    text = resolve(PRESETS[1], "preset").read_text()
    mine = tmp_path / "mine.toml"
    mine.write_text(text)
    with Terminal([PRESETS[0], str(mine), *CARD, "--source", "pink"], server.environment) as terminal:
        terminal.wait_for("Volume is down: begin, muted?")
        terminal.press("\n")
        terminal.wait_for("Output: muted")
        engine = engine_of(terminal.process)
        for keys, shown in (
            ("u", "Output: coming up"), ("2", "You hear lane 2 on pink at 0.0 dB, on vsink."), ("b", "You hear lane 1"),
            ("---", "at \N{MINUS SIGN}3.0 dB"), ("hh", "takes over by fade"),
            ("d>", "the difference from exact is raised by 6 dB"), ("D", "the difference from lane 2"),
            ("?", "come up by ramp"), ("9", "There is no lane 9."), (" ", "Output: muted"),
        ):
            terminal.press(keys)
            terminal.wait_for(shown)
        terminal.press("2")
        terminal.wait_for("You hear lane 2")
        mine.write_text(text.replace("Rumble filter", "Another filter").replace("frequency = 28.0", "frequency = 30.0"))
        terminal.wait_for("Lane 2 is taken as it was saved, by fade.")
        terminal.wait_for("2  Another filter")
        mine.write_text("rate = 48000\n")
        terminal.wait_for("mine.toml: the old version is kept.")
        terminal.wait_for("2  Another filter")
        os.close(terminal.handle)
        terminal.wait()
    assert has_ended(engine)


@pytest.mark.slow
def test_the_caution_is_acknowledged_once_and_ctrl_c_ends(server: SoundServer) -> None:
    with Terminal([PRESETS[0], *CARD], server.environment) as terminal:
        terminal.wait_for("Output: muted")
        engine = engine_of(terminal.process)
        terminal.press("\x03")
        terminal.wait_for("blocks of 128 frames")
        assert terminal.wait() == 0
        os.close(terminal.handle)
    assert has_ended(engine)


def test_without_a_card_the_remedy_is_told(
    server: SoundServer, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    for name, value in server.environment.items():
        monkeypatch.setenv(name, value)
    assert main(["listen", PRESETS[0], "--device", "nowhere", "--seconds", "1", "--volume-is-down"]) == 3
    said = capsys.readouterr().err
    assert 'Could not open the sound card "nowhere"' in said
    assert "--no-device runs without a sound card" in said
    assert "Expression" not in said, "what PortAudio chatters is kept away"


def test_devices_are_listed(server: SoundServer, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    for name, value in server.environment.items():
        monkeypatch.setenv(name, value)
    assert main(["listen", "--devices"]) == 0
    assert "vsink" in capsys.readouterr().out
