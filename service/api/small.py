"""Small bodies: everything but a log is JSON of a few kilobytes, received whole before a route sees it."""

from __future__ import annotations

from starlette.types import ASGIApp, Message, Receive, Scope, Send

from service.api.problems import respond
from service.errors import Problem

LARGEST = 2**17  # bytes

TOO_LARGE = Problem(
    "too-large",
    f"This body is larger than the {LARGEST:,} bytes that anything but a log may have. Logs go to /v1/reports, or to "
    "/v1/loops/{loop}/logs.",
    {"limit_bytes": LARGEST},
)


class SmallBodies:
    """ASGI middleware; logs pass it untouched: `body.receive` has their limit."""

    def __init__(self, app: ASGIApp) -> None:
        self._app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http" or not takes_json(scope["method"], scope["path"]):
            await self._app(scope, receive, send)
            return
        body, last = b"", False
        announced = dict(scope["headers"]).get(b"content-length", b"0")
        large = announced.isdigit() and int(announced) > LARGEST
        while not (large or last):
            message = await receive()
            if message["type"] != "http.request":
                return  # the client has gone
            body += message.get("body", b"")
            last, large = not message.get("more_body", False), len(body) > LARGEST
        if large:
            await respond(TOO_LARGE)(scope, receive, send)
            return
        whole: list[Message] = [{"type": "http.request", "body": body, "more_body": False}]

        async def again() -> Message:
            return whole.pop() if whole else await receive()

        await self._app(scope, again, send)


def takes_json(method: str, path: str) -> bool:
    return method == "PUT" or path.endswith("/tunings")
