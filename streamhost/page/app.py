"""What is served: the files of the page as they are in the package, and the one WebSocket over which it lives."""

import asyncio
import contextlib
from collections.abc import Awaitable, Callable
from importlib.resources import files
from typing import Protocol

import msgspec
from starlette.applications import Starlette
from starlette.middleware import Middleware
from starlette.requests import Request
from starlette.responses import Response
from starlette.routing import Route, WebSocketRoute
from starlette.websockets import WebSocket, WebSocketDisconnect

from streamhost.page import messages
from streamhost.page.door import Door
from streamhost.page.pictures import Pictures
from streamhost.page.sitting import Sitting

TYPES = {".html": "text/html", ".css": "text/css", ".js": "text/javascript"}
PATIENCE_S = 5.0
PICTURE_S = 1.0 / 30.0
REFUSED, TOO_MUCH = 1008, 1013


class Served(Protocol):
    """What the application needs of a `Page`."""

    sitting: Sitting

    def is_key(self, text: str) -> bool: ...

    def ask(self, action: messages.Action) -> None: ...


def application(page: Served, pictures: Pictures, port: int) -> Starlette:
    """The application, behind its door."""

    async def live(websocket: WebSocket) -> None:
        await websocket.accept()
        with contextlib.suppress(WebSocketDisconnect, RuntimeError):
            await _Visit(page, pictures, websocket).run()

    return Starlette(
        routes=[Route("/", _file("index.html", port)), *(Route(f"/{name}", _file(name, port)) for name in _names()),
                WebSocketRoute("/live", live)],
        middleware=[Middleware(Door, port=port)],
    )


def _names() -> list[str]:
    return sorted(each.name for each in (files("streamhost.page") / "static").iterdir() if not each.name.endswith(".html"))


def _file(name: str, port: int) -> Callable[[Request], Awaitable[Response]]:
    """A file that was read when the server started: no request names a file."""
    content = (files("streamhost.page") / "static" / name).read_bytes()
    kind = TYPES["." + name.rsplit(".")[-1]]

    async def answer(request: Request) -> Response:
        return Response(content, media_type=kind, headers=_headers(port))

    return answer


def _headers(port: int) -> dict[str, str]:
    policy = ("default-src 'none'; img-src data:; script-src 'self'; style-src 'self'; "
              f"connect-src 'self' ws://127.0.0.1:{port} ws://localhost:{port}; "
              "base-uri 'none'; form-action 'none'; frame-ancestors 'none'")
    return {
        "Content-Security-Policy": policy, "X-Content-Type-Options": "nosniff", "Referrer-Policy": "no-referrer",
        "Cross-Origin-Opener-Policy": "same-origin", "Cross-Origin-Resource-Policy": "same-origin", "Cache-Control": "no-store",
    }


class _Visit:
    """One open page. It asks for each picture: one that is slow gets the latest when it asks, and nothing piles up."""

    def __init__(self, page: Served, pictures: Pictures, websocket: WebSocket) -> None:
        self._page, self._pictures, self._websocket = page, pictures, websocket
        self._wanted = asyncio.Event()

    async def run(self) -> None:
        if not await self._is_let_in():
            await self._websocket.close(REFUSED)
            return
        sending = asyncio.create_task(self._send())
        try:
            await self._listen()
        finally:
            sending.cancel()

    async def _is_let_in(self) -> bool:
        try:
            first = messages.decode(await asyncio.wait_for(self._text(), PATIENCE_S))
        except (TimeoutError, msgspec.DecodeError):
            return False
        return isinstance(first, messages.Open) and self._page.is_key(first.key)

    async def _listen(self) -> None:
        allowance = messages.Allowance()
        while True:
            text = await self._text()
            if allowance.is_spent():
                await self._websocket.close(TOO_MUCH)
                return
            try:
                message = messages.decode(text)
            except msgspec.DecodeError:
                await self._websocket.close(REFUSED)
                return
            match message:
                case messages.Next():
                    self._wanted.set()
                case messages.Mute():
                    self._page.sitting.mute()
                case messages.Open():
                    pass
                case _:
                    self._page.ask(message)

    async def _text(self) -> str:
        """The next message; one that is no text is empty, which is none that may be sent."""
        message = await self._websocket.receive()
        if message["type"] == "websocket.disconnect":
            raise WebSocketDisconnect(message.get("code", 1000))
        return message.get("text") or ""

    async def _send(self) -> None:
        seen: set[object] = set()
        while True:
            await self._wanted.wait()
            self._wanted.clear()
            await self._websocket.send_bytes(self._pictures.latest(seen))
            await asyncio.sleep(PICTURE_S)
