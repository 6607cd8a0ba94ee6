"""Figures for the operator, in the Prometheus text format."""

from __future__ import annotations

import time

from prometheus_client import (
    CONTENT_TYPE_LATEST,
    CollectorRegistry,
    Counter,
    Gauge,
    Histogram,
    generate_latest,
)
from starlette.responses import Response
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from service.errors import Problem
from service.work.workers import Workers

METHODS = ("GET", "HEAD", "POST", "PUT", "DELETE", "OPTIONS")


class Metrics:
    """The figures of one service; a registry of its own, so that two services in one process do not mix."""

    def __init__(self, workers: Workers) -> None:
        self._registry = CollectorRegistry()
        self._requests = Counter(
            "gainwright_requests",
            "Requests answered.",
            ("method", "route", "status"),
            registry=self._registry,
        )
        self._seconds = Histogram(
            "gainwright_request_seconds", "Time to an answer.", ("route",), registry=self._registry
        )
        self._analyses = Counter(
            "gainwright_analyses",
            "Logs analysed, by outcome: report, or the code of the problem.",
            ("outcome",),
            registry=self._registry,
        )
        admitted = Gauge(
            "gainwright_logs_admitted", "Logs being received, waiting or analysed.", registry=self._registry
        )
        admitted.set_function(lambda: workers.admitted)
        replaced = Gauge(
            "gainwright_workers_replaced", "Worker processes started for lost ones.", registry=self._registry
        )
        replaced.set_function(lambda: workers.replaced)

    def answered(self, method: str, route: str, status: int, seconds: float) -> None:
        self._requests.labels(method, route, str(status)).inc()
        self._seconds.labels(route).observe(seconds)

    def analysed(self, answer: bytes | Problem) -> None:
        self._analyses.labels(answer.code if isinstance(answer, Problem) else "report").inc()

    def text(self) -> Response:
        return Response(generate_latest(self._registry), headers={"Content-Type": CONTENT_TYPE_LATEST})


class Measured:
    """ASGI middleware: counts every answer under its route, never under an address a caller made up."""

    def __init__(self, app: ASGIApp, metrics: Metrics) -> None:
        self._app = app
        self._metrics = metrics

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self._app(scope, receive, send)
            return
        status = 500
        begun = time.perf_counter()

        async def sending(message: Message) -> None:
            nonlocal status
            if message["type"] == "http.response.start":
                status = message["status"]
            await send(message)

        try:
            await self._app(scope, receive, sending)
        finally:
            route = getattr(scope.get("route"), "path", "none")
            method = scope["method"] if scope["method"] in METHODS else "other"
            self._metrics.answered(method, route, status, time.perf_counter() - begun)
