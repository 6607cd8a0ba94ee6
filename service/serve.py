"""Serve: the application behind a listening socket, with one line that says where the page is."""

from __future__ import annotations

import logging
import socket
import sys

import uvicorn

from service.app import create_app
from service.errors import ProblemError
from service.settings import Settings
from service.store import Store

GRACE_S = 10  # for answers under way when the service is stopped


class Announced(uvicorn.Server):
    """Prints the address once it is listening, so that port 0 (any free one) can be used."""

    async def startup(self, sockets: list[socket.socket] | None = None) -> None:
        await super().startup(sockets=sockets)
        if self.started:
            host, port = self.servers[0].sockets[0].getsockname()[:2]
            print(f"gainwright listens; the page is at {address(host, port)} (Ctrl-C stops it)", flush=True)


def address(host: str, port: int) -> str:
    """Where a browser on this machine finds the page."""
    name = {"0.0.0.0": "127.0.0.1", "::": "[::1]"}.get(host, f"[{host}]" if ":" in host else host)
    return f"http://{name}:{port}/"


def serve(settings: Settings) -> int:
    """Run until stopped; 0 after an orderly stop, 1 if it could not start."""
    logging.basicConfig(level=settings.log_level.upper())
    app = create_app(settings)
    store: Store = app.state.shared.store
    try:
        store.open()  # here, so that what stands in its way is said in a sentence
    except ProblemError as error:
        print(f"gainwright: {error.problem.detail}\n  code: {error.problem.code}", file=sys.stderr)
        return 1
    server = Announced(
        uvicorn.Config(
            app,
            host=settings.host,
            port=settings.port,
            log_level=settings.log_level,
            access_log=False,
            server_header=False,
            timeout_graceful_shutdown=GRACE_S,
        )
    )
    try:
        server.run()
    except KeyboardInterrupt:
        pass  # raised again by uvicorn after its orderly stop
    except SystemExit:
        return 1  # uvicorn has said why
    finally:
        store.close()
    return 0 if server.started else 1
