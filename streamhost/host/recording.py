"""What is heard, into a file: a thread empties the ring that the step fills and never waits for."""

import threading
import time
from types import TracebackType
from typing import Self

import numpy as np

from streamhost.files import AudioWriter
from streamhost.host.shared import Shared

PAUSE_S = 0.02


class Recorder:
    """Records from now to the end of the `with` block; `lost` counts the frames that the disk was too slow for.

    What goes wrong on the disk ends the recording, not the sound, and is raised at the end of the block.
    """

    def __init__(self, shared: Shared, writer: AudioWriter) -> None:
        self._shared, self._writer = shared, writer
        self._problem: BaseException | None = None
        self._ending = threading.Event()
        self._thread = threading.Thread(target=self._empty, name="recorder", daemon=True)

    def __enter__(self) -> Self:
        self._writer.__enter__()
        self._overruns = int(self._shared.meters["overruns"][0])
        self._shared.control["drained"] = self._shared.meters["recorded"]
        self._shared.control["recording"] = 1
        self._thread.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._shared.control["recording"] = 0
        self._ending.set()
        self._thread.join()
        if kind is None and self._problem is not None:
            kind, error, trace = type(self._problem), self._problem, self._problem.__traceback__
            self._writer.__exit__(kind, error, trace)
            raise self._problem
        self._writer.__exit__(kind, error, trace)

    @property
    def lost(self) -> int:
        return int(self._shared.meters["overruns"][0]) - self._overruns

    def room(self) -> int:
        """Frames that the ring takes before any are lost; without end when the recording has ended."""
        if self._problem is not None:
            return 1 << 62
        waiting = int(self._shared.meters["recorded"][0]) - int(self._shared.control["drained"][0])
        return len(self._shared.recording) - waiting

    def _empty(self) -> None:
        try:
            while not self._ending.is_set():
                self._drain()
                self._ending.wait(PAUSE_S)
            self._drain()
        except BaseException as problem:
            self._problem = problem
            self._shared.control["recording"] = 0

    def _drain(self) -> None:
        ring, control = self._shared.recording, self._shared.control
        at, end = int(control["drained"][0]), int(self._shared.meters["recorded"][0])
        while at < end:
            place = at % len(ring)
            frames = min(end - at, len(ring) - place)
            self._writer.write(np.array(ring[place : place + frames]))
            at += frames
            control["drained"] = at


def wait_for_room(recorder: Recorder, frames: int) -> None:
    """For drivers that are not bound to time."""
    while recorder.room() < frames:
        time.sleep(PAUSE_S / 4)
