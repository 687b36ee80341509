"""Who is let in: requests to this machine by its own name, from pages that it served itself."""

from collections.abc import Mapping

from starlette.types import ASGIApp, Receive, Scope, Send

NAMES = ("127.0.0.1", "localhost")
SAME = ("same-origin", "none")
"""What browsers say of requests of a page to its own server, and of an address that a user opened."""


class Door:
    """Refuses, before anything is read, what another site or another name for this machine sent.

    A page of another site has another Origin; one whose name was bound to this machine afterwards has another Host.
    WebSockets know no rule of the same origin, so that they must say theirs.
    """

    def __init__(self, app: ASGIApp, port: int) -> None:
        self._app = app
        self._hosts = frozenset(f"{name}:{port}" for name in NAMES)
        self._origins = frozenset(f"http://{host}" for host in self._hosts)

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] == "lifespan" or self._may_enter(scope):
            await self._app(scope, receive, send)
        elif scope["type"] == "websocket":
            await send({"type": "websocket.close", "code": 1008})
        else:
            await send({"type": "http.response.start", "status": 403, "headers": [(b"content-type", b"text/plain")]})
            await send({"type": "http.response.body", "body": b"This page is for this machine only.\n"})

    def _may_enter(self, scope: Scope) -> bool:
        headers = _headers(scope)
        if headers is None or headers.get("host") not in self._hosts:
            return False
        origin = headers.get("origin")
        if scope["type"] == "websocket":
            return origin in self._origins
        return scope["method"] in ("GET", "HEAD") and (origin is None or origin in self._origins) and \
            headers.get("sec-fetch-site", "none") in SAME


def _headers(scope: Scope) -> Mapping[str, str] | None:
    """The headers; None where one that is judged by comes twice."""
    found: dict[str, str] = {}
    for raw, value in scope["headers"]:
        name = raw.decode("latin-1").lower()
        if name in found and name in ("host", "origin", "sec-fetch-site"):
            return None
        found[name] = value.decode("latin-1")
    return found
