"""A browser without a window that is driven over a pipe: pages, keys, sizes, pictures.

Its protocol is the browser's own for developers' tools: JSON messages, each ended by a zero byte, on descriptors 3 and 4.
"""

import base64
import json
import os
import subprocess
import sys
import time
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from browser import FLAGS, browser

PATIENCE = 60.0

# Puts two descriptors where the browser looks for them, and becomes the browser.
START = """
import os, sys
ends = [os.dup(os.dup(int(each))) for each in sys.argv[1:3]]
for place, end in zip((3, 4), ends):
    os.dup2(end, place, inheritable=True)
os.execv(sys.argv[3], sys.argv[3:])
"""
KEYS = {"Tab": 9, "ArrowLeft": 37, "ArrowRight": 39, "ArrowUp": 38, "ArrowDown": 40}


class Session:
    """One page in a browser of its own; `errors` are what its console complains of, `requests` the addresses it asked for."""

    def __init__(self, folder: Path) -> None:
        program = browser()
        assert program is not None, "the browser is there"
        down, to_browser = os.pipe()
        from_browser, up = os.pipe()
        flags = [*FLAGS, "--remote-debugging-pipe", f"--user-data-dir={folder / 'profile'}", "about:blank"]
        self._process = subprocess.Popen([sys.executable, "-c", START, str(down), str(up), program, *flags],
                                         pass_fds=(down, up), stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        os.close(down)
        os.close(up)
        self._down, self._up = to_browser, from_browser
        self._number, self._pending = 0, b""
        self.errors: list[str] = []
        self.requests: list[str] = []
        self._session = self.address = ""
        target = next(each for each in self.send("Target.getTargets")["targetInfos"] if each["type"] == "page")
        self._session = self.send("Target.attachToTarget", targetId=target["targetId"], flatten=True)["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.send(f"{domain}.enable")

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._process.terminate()
        self._process.wait(timeout=PATIENCE)
        os.close(self._down)
        os.close(self._up)

    def send(self, method: str, **parameters: Any) -> dict[str, Any]:
        """One command and its answer; what is told in between is noted."""
        self._number += 1
        message = {"id": self._number, "method": method, "params": parameters}
        if self._session:
            message["sessionId"] = self._session
        os.write(self._down, json.dumps(message).encode() + b"\0")
        while True:
            heard = self._hear()
            if heard.get("id") == self._number:
                assert "error" not in heard, (method, heard)
                result: dict[str, Any] = heard["result"]
                return result

    def _hear(self) -> dict[str, Any]:
        while b"\0" not in self._pending:
            piece = os.read(self._up, 1 << 20)
            assert piece, "the browser is there"
            self._pending += piece
        text, self._pending = self._pending.split(b"\0", 1)
        heard: dict[str, Any] = json.loads(text)
        self._note(heard.get("method", ""), heard.get("params", {}))
        return heard

    def _note(self, method: str, told: dict[str, Any]) -> None:
        if method == "Runtime.exceptionThrown":
            self.errors.append(str(told["exceptionDetails"].get("exception", told)))
        elif method == "Log.entryAdded" and told["entry"]["level"] in ("error", "warning"):
            self.errors.append(told["entry"]["text"])
        elif method == "Network.requestWillBeSent":
            self.requests.append(told["request"]["url"])

    def open(self, address: str) -> None:
        """Go to a page, and wait until it is there."""
        self.send("Page.navigate", url=address)
        end = time.monotonic() + PATIENCE
        while self.ask("location.href + document.readyState") != f"{address}complete":
            assert time.monotonic() < end, f"{address} does not come"

    def ask(self, expression: str) -> Any:
        """The value of an expression in the page."""
        told = self.send("Runtime.evaluate", expression=expression, returnByValue=True, awaitPromise=True)
        assert "exceptionDetails" not in told, told
        return told["result"].get("value")

    def press(self, key: str, *, shift: bool = False) -> None:
        """A key, by its name or its character."""
        text = {} if key in KEYS else {"text": key}
        code = KEYS.get(key, ord(key[0].upper()))
        for kind in ("keyDown", "keyUp"):
            self.send("Input.dispatchKeyEvent", type=kind, key=key, windowsVirtualKeyCode=code, modifiers=8 * shift,
                      **(text if kind == "keyDown" else {}))
        self.ask("new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))")

    def drag(self, start: tuple[float, float], end: tuple[float, float]) -> None:
        """With the left button."""
        for kind, (x, y) in (("mousePressed", start), ("mouseMoved", end), ("mouseReleased", end)):
            self.send("Input.dispatchMouseEvent", type=kind, x=x, y=y, button="left", buttons=1, clickCount=1)
        self.ask("new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))")

    def size(self, wide: int, high: int) -> None:
        self.send("Emulation.setDeviceMetricsOverride", width=wide, height=high, deviceScaleFactor=1, mobile=False)

    def media(self, *, scheme: str = "light", kind: str = "") -> None:
        """Light or dark, screen or print."""
        self.send("Emulation.setEmulatedMedia", media=kind, features=[{"name": "prefers-color-scheme", "value": scheme}])

    def picture(self, path: Path, *, whole: bool = False) -> None:
        """What is to be seen, or the whole page."""
        told = self.send("Page.captureScreenshot", format="png", captureBeyondViewport=whole)
        path.write_bytes(base64.b64decode(told["data"]))

    def print(self, path: Path) -> None:
        """As PDF, on the paper that the page asks for."""
        told = self.send("Page.printToPDF", preferCSSPageSize=True, printBackground=False)
        path.write_bytes(base64.b64decode(told["data"]))
