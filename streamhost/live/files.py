"""Files that are looked at while lanes run: a saved change is built beside the audio, and told when it is ready or broken."""

import hashlib
import time
from collections.abc import Callable, Mapping, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType
from typing import Self

from streamhost.errors import StreamhostError
from streamhost.host.lane import Lane
from streamhost.live.recipe import LaneAsked
from streamhost.presets import Preset

LOOK_S = 0.2


@dataclass(frozen=True, eq=False)
class Taken:
    """A lane that is ready to run, compiled, and the preset that it is made of."""

    preset: Preset
    asked: LaneAsked
    lane: Lane


@dataclass(frozen=True, eq=False)
class Built:
    """What a file has become: a lane for each of `numbers`; or the `problem` with it."""

    path: Path
    numbers: tuple[int, ...]
    lanes: tuple[Taken, ...] = ()
    problem: str = ""


class Files:
    """The files of lanes, by the numbers of the lanes that each makes; `build` reads, checks and compiles one."""

    def __init__(
        self, files: Mapping[Path, Sequence[int]], build: Callable[[Path], Sequence[Taken]],
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        self._numbers = {path: tuple(numbers) for path, numbers in files.items()}
        self._build, self._clock = build, clock
        self._marks = {path: _mark(path) for path in files}
        self._hashes = {path: _hash(path) for path in files}
        self._under_way: dict[Path, Future[Built]] = {}
        self._looked = clock()

    def __enter__(self) -> Self:
        self._worker = ThreadPoolExecutor(1, "files")
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._worker.shutdown(wait=False, cancel_futures=True)

    def tend(self) -> list[Built]:
        """Look, a few times a second, and hand over what has been built."""
        if self._clock() - self._looked >= LOOK_S:
            self._looked = self._clock()
            for path in self._numbers:
                self._look(path)
        done = [path for path, future in self._under_way.items() if future.done()]
        return [self._under_way.pop(path).result() for path in done]

    def _look(self, path: Path) -> None:
        """A file is built when its text has changed, and not while it is being written or built."""
        mark = _mark(path)
        if mark == self._marks[path] or path in self._under_way:
            return
        self._marks[path] = mark
        found = _hash(path)
        if found and found != self._hashes[path]:
            self._hashes[path] = found
            self._under_way[path] = self._worker.submit(self._built, path)

    def _built(self, path: Path) -> Built:
        numbers = self._numbers[path]
        try:
            lanes = tuple(self._build(path))
        except StreamhostError as problem:
            return Built(path, numbers, problem=str(problem))
        if len(lanes) != len(numbers):
            return Built(path, numbers, problem=f"{path.name} makes {len(lanes)} lanes now, and {len(numbers)} run.")
        return Built(path, numbers, lanes)


def _mark(path: Path) -> tuple[int, int]:
    """What changes when a file is saved; nothing while it is away, as between two steps of an editor."""
    try:
        status = path.stat()
    except OSError:
        return (0, 0)
    return (status.st_mtime_ns, status.st_size)


def _hash(path: Path) -> str:
    try:
        return hashlib.sha256(path.read_bytes()).hexdigest()
    except OSError:
        return ""
