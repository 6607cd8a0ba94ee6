"""Drain: receive the rest of a body before answering early.

A server that answers and closes while the client is still sending resets the connection, and most clients
then report a broken pipe instead of the answer. So the rest is received and dropped, for a bounded time.
"""

from __future__ import annotations

import asyncio

from starlette.types import ASGIApp, Message, Receive, Scope, Send

PATIENCE_S = 30.0  # for all of it
PAUSE_S = 2.0  # between two pieces: a stalled client gets its answer soon


class Drain:
    """ASGI middleware; nothing is dropped for a client that waits for `100 Continue`, it has not sent yet."""

    def __init__(self, app: ASGIApp) -> None:
        self._app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self._app(scope, receive, send)
            return
        headers = dict(scope["headers"])
        chunked = b"transfer-encoding" in headers
        # Only a body that was announced can be outstanding; receiving once more would wait for a disconnect.
        pending = chunked or headers.get(b"content-length", b"0") != b"0"
        waits = headers.get(b"expect", b"").lower() == b"100-continue"

        async def receiving() -> Message:
            nonlocal pending, waits
            waits = False
            message = await receive()
            pending = pending and bool(message.get("more_body", False))
            return message

        async def sending(message: Message) -> None:
            if message["type"] == "http.response.start" and pending and not waits:
                try:
                    async with asyncio.timeout(PATIENCE_S):
                        while pending:
                            await asyncio.wait_for(receiving(), PAUSE_S)
                except TimeoutError:
                    pass  # answered all the same; the connection closes
            await send(message)

        await self._app(scope, receiving, sending)
