"""A sound server of the tests' own with a virtual sound card, and an independent ear on it."""

import ctypes
import os
import shutil
import signal
import socket
import subprocess
import sys
import tempfile
import time
from pathlib import Path
from types import TracebackType
from typing import Self

import numpy as np
from numpy.typing import NDArray

RATE = 48000
NEEDED = ("pulseaudio", "parec", "pactl")
SINK = "format=float32le rate=48000 channels=2 channel_map=front-left,front-right norewinds=1"

ALSA = """
</usr/share/alsa/alsa.conf>
pcm.vsink { type pulse  device "vsink"  hint { show on description "virtual sink" } }
pcm.vduplex {
  type asym
  playback.pcm { type pulse device "vsink" }
  capture.pcm { type pulse device "vsink.monitor" }
  hint { show on description "what is played comes in again" }
}
pcm.!default { type pulse }
ctl.!default { type pulse }
"""


def is_there() -> bool:
    """Whether this machine can run one."""
    return all(shutil.which(name) for name in NEEDED)


def _end_with_parent() -> None:
    """In the child: Linux ends it when the process that started it ends, however that happens."""
    if sys.platform == "linux":
        ctypes.CDLL(None).prctl(1, signal.SIGKILL)


class SoundServer:
    """A daemon with the sink `vsink`, stereo float32 at 48 kHz; programs find it with `environment`."""

    def __enter__(self) -> Self:
        self.folder = Path(tempfile.mkdtemp(prefix="streamhost-sound-"))
        self.socket = self.folder / "native"
        (self.folder / "asound.conf").write_text(ALSA)
        self.environment = {
            **os.environ, "HOME": str(self.folder), "XDG_RUNTIME_DIR": str(self.folder), "XDG_CONFIG_HOME": str(self.folder),
            "XDG_STATE_HOME": str(self.folder), "PULSE_SERVER": f"unix:{self.socket}",
            "ALSA_CONFIG_PATH": str(self.folder / "asound.conf"),
        }
        self.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.kill()
        shutil.rmtree(self.folder, ignore_errors=True)

    def start(self) -> None:
        """Returns when it can be connected to."""
        self._daemon = subprocess.Popen(
            ["pulseaudio", "-n", "--daemonize=no", "--use-pid-file=no", "--exit-idle-time=-1", "--high-priority=no",
             "--realtime=no", "--log-target=stderr", "--fail=yes",
             f"--load=module-native-protocol-unix socket={self.socket} auth-anonymous=1 auth-cookie-enabled=0",
             f"--load=module-null-sink sink_name=vsink {SINK}"],
            env=self.environment, stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
            preexec_fn=_end_with_parent,
        )
        until = time.monotonic() + 10.0
        while time.monotonic() < until:
            with socket.socket(socket.AF_UNIX) as client:
                try:
                    client.connect(str(self.socket))
                    return
                except OSError:
                    time.sleep(0.01)
        raise RuntimeError("the sound server did not start")

    def kill(self) -> None:
        """At once, as if it had crashed."""
        self._daemon.kill()
        self._daemon.wait()
        self.socket.unlink(missing_ok=True)

    def freeze(self) -> None:
        self._daemon.send_signal(signal.SIGSTOP)

    def thaw(self) -> None:
        self._daemon.send_signal(signal.SIGCONT)

    def suspend(self, yes: bool) -> None:
        """The sink stands still, or goes on."""
        subprocess.run(["pactl", "suspend-sink", "vsink", str(int(yes))], env=self.environment, check=True, timeout=10)

    def ear(self) -> "Ear":
        return Ear(self)


class Ear:
    """Records what the sink plays, as long as the context lasts; then `heard` is (frames, 2) float32."""

    def __init__(self, server: SoundServer) -> None:
        self._server = server

    def __enter__(self) -> Self:
        self._file = tempfile.TemporaryFile()
        self._process = subprocess.Popen(
            ["parec", "--raw", "-d", "vsink.monitor", "--format=float32le", f"--rate={RATE}", "--channels=2",
             "--latency-msec=20"],
            stdout=self._file, stdin=subprocess.DEVNULL, env=self._server.environment, preexec_fn=_end_with_parent,
        )
        time.sleep(0.25)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        time.sleep(0.15)
        self._process.terminate()
        self._process.wait()
        self._file.seek(0)
        data = self._file.read()
        self._file.close()
        self.heard: NDArray[np.float32] = np.frombuffer(data[: len(data) // 8 * 8], np.float32).reshape(-1, 2)


def counted(heard: NDArray[np.float32]) -> tuple[NDArray[np.int64], NDArray[np.float32]]:
    """The frames that were heard, by their count, and the sound beside it; silence of before and after is left out."""
    count = np.rint(heard[:, 1].astype(np.float64) * 2**24).astype(np.int64)
    there = np.flatnonzero(count)
    return count[there], heard[there, 0]
