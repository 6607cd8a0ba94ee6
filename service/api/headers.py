"""Headers that every answer carries: nothing from elsewhere, no guessed types, no stale copies."""

from __future__ import annotations

from starlette.datastructures import MutableHeaders
from starlette.types import ASGIApp, Message, Receive, Scope, Send

FIXED = {
    "Content-Security-Policy": ("default-src 'self'; base-uri 'none'; form-action 'self'; frame-ancestors 'none'"),
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "no-referrer",
    # Kept copies are asked about each time (ETag, 304): a new version shows at once.
    "Cache-Control": "no-cache",
}


class FixedHeaders:
    """ASGI middleware."""

    def __init__(self, app: ASGIApp) -> None:
        self._app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        async def sending(message: Message) -> None:
            if message["type"] == "http.response.start":
                headers = MutableHeaders(scope=message)
                for name, value in FIXED.items():
                    headers.setdefault(name, value)
            await send(message)

        await self._app(scope, receive, sending)
