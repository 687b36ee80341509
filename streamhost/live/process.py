"""The engine process as its parent sees it: started, spoken to, listened to, killed."""

import contextlib
import os
import subprocess
import sys
import tempfile
from multiprocessing import Pipe
from typing import Any

from streamhost.live.memory import Memory

_START = "import sys; sys.path[:] = {path!r}; from streamhost.live.start import main; main({connection}, {memory})"
LAST_WORDS = 2000


class Process:
    """An engine in a session of its own: Ctrl-C and a closed terminal come to the parent only.

    It begins to load at once; `send` gives it first (the folder of kernels or None, recipe), then messages.
    """

    def __init__(self, memory: Memory) -> None:
        self._connection, theirs = Pipe()
        self._errors = tempfile.TemporaryFile()  # noqa: SIM115 - lives as long as the process
        start = _START.format(path=sys.path, connection=theirs.fileno(), memory=memory.handle)
        self._process = subprocess.Popen(
            [sys.executable, "-c", start], stdin=subprocess.DEVNULL, stdout=self._errors, stderr=self._errors,
            pass_fds=(theirs.fileno(), memory.handle), start_new_session=True,
            env={**os.environ, "OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1"},
        )
        theirs.close()

    def send(self, message: object) -> None:
        """To an engine that has ended nothing is sent: `is_alive` tells."""
        with contextlib.suppress(OSError):
            self._connection.send(message)

    def reports(self) -> list[tuple[Any, ...]]:
        """What it has told since."""
        found = []
        with contextlib.suppress(OSError, EOFError):
            while self._connection.poll():
                found.append(self._connection.recv())
        return found

    @property
    def pid(self) -> int:
        return self._process.pid

    @property
    def is_alive(self) -> bool:
        return self._process.poll() is None

    def kill(self) -> None:
        """End it whatever it is doing; more than once does no harm."""
        self._connection.close()
        self._process.kill()
        self._process.wait()
        self._errors.close()

    def last_words(self) -> str:
        """The end of what it said on its error channel."""
        self._errors.seek(0)
        return self._errors.read()[-LAST_WORDS:].decode(errors="replace").strip()
