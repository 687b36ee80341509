"""The engine process as its parent sees it: started, spoken to, listened to, killed."""

import contextlib
import os
import subprocess
import sys
import tempfile
from multiprocessing import Pipe
from typing import Any

from streamhost.cache import kernel_folder
from streamhost.live.memory import Memory
from streamhost.live.recipe import Recipe

_START = "import sys; sys.path[:] = {path!r}; from streamhost.live.engine import main; main({connection}, {memory})"
LAST_WORDS = 2000


class Process:
    """An engine at work on a recipe, in a session of its own: Ctrl-C and a closed terminal come to the parent only."""

    def __init__(self, recipe: Recipe, memory: Memory) -> None:
        self._connection, theirs = Pipe()
        self._errors = tempfile.TemporaryFile()  # noqa: SIM115 - lives as long as the process
        start = _START.format(path=sys.path, connection=theirs.fileno(), memory=memory.handle)
        self._process = subprocess.Popen(
            [sys.executable, "-c", start], stdin=subprocess.DEVNULL, stdout=self._errors, stderr=self._errors,
            pass_fds=(theirs.fileno(), memory.handle), start_new_session=True, env=_environment(),
        )
        theirs.close()
        self.send(recipe)

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
    def is_alive(self) -> bool:
        return self._process.poll() is None

    def kill(self) -> None:
        """End it whatever it is doing."""
        self._connection.close()
        self._process.kill()
        self._process.wait()
        self._errors.close()

    def last_words(self) -> str:
        """The end of what it said on its error channel."""
        self._errors.seek(0)
        return self._errors.read()[-LAST_WORDS:].decode(errors="replace").strip()


def _environment() -> dict[str, str]:
    """Kernels are taken from where this process put them, which may be a folder of its own."""
    folder = kernel_folder()
    chosen = {"OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1"}
    return {**os.environ, **chosen, **({"STREAMHOST_CACHE": str(folder.parent)} if folder else {})}
