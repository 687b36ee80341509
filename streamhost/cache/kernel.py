"""The files of one kernel: its text, numba's compiled files beside it, and the seal over those."""

import contextlib
import hashlib
import os
import tempfile
import time
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import IO

LOCK_SECONDS = 60.0  # a kernel at the limit of size compiles in about 20 s

in_use: set[str] = set()  # keys of the kernels that this process runs


@dataclass(frozen=True)
class Kernel:
    """The files of the kernel with this key in this folder, whether they exist yet or not."""

    folder: Path
    key: str

    @property
    def text(self) -> Path:
        return self.folder / f"k_{self.key}.py"

    @property
    def seal(self) -> Path:
        return self.folder / f"k_{self.key}.seal"

    def compiled(self) -> list[Path]:
        return sorted((self.folder / "__pycache__").glob(f"k_{self.key}.*.nb[ic]"))

    def is_sealed(self) -> bool:
        """There are compiled files, and they are the very ones that were sealed."""
        try:
            sealed = self.seal.read_bytes()
            return sealed != b"" and sealed == self._fingerprint()
        except OSError:
            return False

    def put_seal(self) -> None:
        """Vouch for the compiled files as they are. A seal that cannot be written only costs the next start time."""
        with contextlib.suppress(OSError):
            place(self.seal, self._fingerprint())

    def mark_used(self) -> None:
        """Set the time of last use; on the seal, since older numba takes a new time on the text for a new text."""
        with contextlib.suppress(OSError):
            os.utime(self.seal)

    def drop_compiled(self) -> None:
        remove([self.seal, *self.compiled()])

    def _fingerprint(self) -> bytes:
        lines = [f"{hashlib.sha256(file.read_bytes()).hexdigest()} {file.name}\n" for file in self.compiled()]
        return "".join(lines).encode()


def place(path: Path, content: bytes) -> None:
    """Write the file whole or not at all; one that already holds just that is left alone."""
    with contextlib.suppress(FileNotFoundError):
        if path.read_bytes() == content:
            return
    handle, name = tempfile.mkstemp(dir=path.parent, prefix=f"{path.stem}.", suffix=".tmp")
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(content)
        Path(name).replace(path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise


def remove(files: Iterable[Path]) -> None:
    """Remove what can be removed; another process may have been first."""
    for file in files:
        with contextlib.suppress(OSError):
            file.unlink()


@contextlib.contextmanager
def alone(text: Path) -> Iterator[None]:
    """One process at a time compiles a kernel, if that can be had within LOCK_SECONDS; else the work is done twice.

    The lock is the operating system's, on the kernel's own text: it ends with the process that holds it, so that
    none is ever left behind.
    """
    with text.open("rb") as file:
        _wait_for_lock(file)
        yield


def _wait_for_lock(file: IO[bytes]) -> None:
    try:
        import fcntl
    except ImportError:  # no POSIX: every file is replaced whole, so that compiling twice does no harm
        return
    until = time.monotonic() + LOCK_SECONDS
    while True:
        try:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
            return
        except BlockingIOError:
            if time.monotonic() >= until:
                return
            time.sleep(0.02)
        except OSError:  # a file system without locks
            return
