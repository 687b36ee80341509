"""The engine process: the stream, the kernels, and nothing else.

Messages come as tuples that begin with their name, and so do reports. What the process says on its error channel goes to
a file of the parent's.
"""

import contextlib
import gc
import os
import queue
import sys
import threading
from collections.abc import Callable
from multiprocessing.connection import Connection
from typing import Any

from streamhost.errors import MachineError, RequestError
from streamhost.host import Host
from streamhost.live.memory import mapped
from streamhost.live.portaudio import Stream, Wanted, rescan
from streamhost.live.recipe import Input, LaneAsked, Planned, Recipe, plan

PAUSE_S = 0.02


class Engine:
    """One host, and at most one stream."""

    def __init__(self, connection: Connection, recipe: Recipe, buffer: Any) -> None:
        self._connection, self._recipe = connection, recipe
        lanes = [each.made(recipe.channels) for each in recipe.lanes]
        self._host: Host = recipe.host(lanes, recipe.shared(buffer))
        self._stream: Stream | None = None
        self._scanned = False

    def run(self, messages: "queue.SimpleQueue[tuple[Any, ...]]") -> None:
        """Obey until told to end; tell when the device has gone."""
        while True:
            try:
                name, *arguments = messages.get(timeout=PAUSE_S)
            except queue.Empty:
                self._watch()
                continue
            if name == "end":
                self._end()
                return
            getattr(self, f"_{name}")(*arguments)

    def _watch(self) -> None:
        self._host.plan.tend()
        if self._stream is not None and not self._stream.is_running:
            self._close(played=False, report="gone")

    def _open(self, wanted: Wanted) -> None:
        try:
            if self._scanned:
                rescan()
            self._scanned = True
            self._stream = Stream(wanted, self._host.callback, self._host.address)
        except MachineError as problem:
            self._connection.send(("refused", str(problem)))
        else:
            self._connection.send(("opened", self._stream.opened))

    def _close(self, *, played: bool = False, report: str = "closed") -> None:
        if self._stream is not None:
            self._stream.close(played=played)
            self._stream = None
        self._connection.send((report,))

    def _change(self, ticket: int, planned: Planned) -> None:
        self._answer(ticket, lambda: plan(self._host, planned))

    def _subtract(self, ticket: int, what: int | str | None, raise_db: float) -> None:
        self._answer(ticket, lambda: self._host.plan.subtract(what, raise_db))

    def _place(self, ticket: int, lane: LaneAsked, slot: int | None) -> None:
        self._answer(ticket, lambda: self._host.plan.place(lane.made(self._recipe.channels), slot))

    def _take(self, ticket: int, given: Input) -> None:
        self._answer(ticket, lambda: self._host.plan.take(given.made(self._recipe.rate, self._recipe.channels)))

    def _answer(self, ticket: int, do: Callable[[], object]) -> None:
        try:
            do()
        except RequestError as problem:
            self._connection.send(("failed", ticket, str(problem)))
        else:
            self._connection.send(("done", ticket))

    def _end(self) -> None:
        if self._stream is not None:
            self._stream.close(played=True)
        self._connection.send(("ended", [lane.state_hash() for lane in self._host.lanes]))


def run(connection_handle: int, memory_handle: int) -> None:
    """All of the process: the recipe comes first, then messages."""
    connection = Connection(connection_handle)
    cache, recipe = connection.recv()
    if cache is not None:
        os.environ["STREAMHOST_CACHE"] = cache
    messages: queue.SimpleQueue[tuple[Any, ...]] = queue.SimpleQueue()
    threading.Thread(target=_listen, args=(connection, messages), name="messages", daemon=True).start()
    try:
        engine = Engine(connection, recipe, mapped(memory_handle, recipe.bytes))
    except RequestError as problem:
        connection.send(("unfit", str(problem)))
        return
    gc.collect()
    gc.freeze()
    gc.disable()
    connection.send(("ready",))
    engine.run(messages)
    sys.stderr.flush()
    os._exit(0)  # PortAudio's own farewell could wait for a server that is gone


def _listen(connection: Connection, messages: "queue.SimpleQueue[tuple[Any, ...]]") -> None:
    with contextlib.suppress(OSError, EOFError):
        while True:
            messages.put(connection.recv())
