"""The page's server: a thread of its own, on this machine's own address, with a key that changes with every run."""

import hmac
import queue
import secrets
import socket
import threading
import time
from collections.abc import Callable
from types import TracebackType
from typing import Self

import uvicorn

from streamhost.errors import MachineError
from streamhost.page import messages
from streamhost.page.app import application
from streamhost.page.door import NAMES
from streamhost.page.pictures import Pictures
from streamhost.page.sitting import Sitting
from streamhost.realization import Realization

WAITING = 64
"""Actions that may wait for the host; one more is dropped and told of."""

START_S = 10.0
MOST_CONNECTIONS = 16


class Page:
    """Serves a sitting. Used as a context. draw: a realization's diagram as SVG, and its caption.

    `attend` must be called by the thread that tends the host, all the time.

    What a page asks for waits until then; only muting does not. MachineError where no port can be had.
    """

    def __init__(self, sitting: Sitting, draw: Callable[[Realization], tuple[str, str]], port: int = 0) -> None:
        self.sitting = sitting
        self._actions: queue.Queue[messages.Action] = queue.Queue(WAITING)
        self._key = secrets.token_urlsafe(24)
        self._socket = socket.socket(socket.AF_INET, socket.SOCK_STREAM)
        try:
            self._socket.bind((NAMES[0], port))
        except OSError as problem:
            self._socket.close()
            raise MachineError(f"The page cannot be served on port {port}: {problem.strerror}. "
                               "--no-page runs without.") from None
        self.port = int(self._socket.getsockname()[1])
        config = uvicorn.Config(
            application(self, Pictures(sitting, draw), self.port), lifespan="off", log_config=None,
            access_log=False, ws="websockets-sansio", http="h11",
            loop="asyncio", ws_max_size=messages.LONGEST, limit_concurrency=MOST_CONNECTIONS, server_header=False,
            timeout_graceful_shutdown=1, proxy_headers=False,
        )
        self._server = uvicorn.Server(config)
        self._thread = threading.Thread(target=self._serve, name="page", daemon=True)

    @property
    def address(self) -> str:
        """What the browser is to open; what stands behind # never leaves the browser but through the page itself."""
        return f"http://{NAMES[0]}:{self.port}/#{self._key}"

    def __enter__(self) -> Self:
        self._thread.start()
        until = time.monotonic() + START_S
        while not self._server.started:
            if not self._thread.is_alive() or time.monotonic() > until:
                raise MachineError("The page's server did not start. --no-page runs without.")
            time.sleep(0.005)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._server.should_exit = True
        self._thread.join(START_S)
        self._socket.close()

    def attend(self) -> None:
        """Do what pages have asked for."""
        for _ in range(WAITING):
            try:
                action = self._actions.get_nowait()
            except queue.Empty:
                return
            messages.act(self.sitting, action)

    def is_key(self, text: str) -> bool:
        return hmac.compare_digest(text.encode(), self._key.encode())

    def ask(self, action: messages.Action) -> None:
        """Have it done by the thread that attends."""
        try:
            self._actions.put_nowait(action)
        except queue.Full:
            self.sitting.notice = "Too much was asked for at once: the last of it was dropped."

    def _serve(self) -> None:
        self._server.run(sockets=[self._socket])


