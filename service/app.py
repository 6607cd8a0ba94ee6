"""create_app: the service put together from its settings."""

from __future__ import annotations

from collections.abc import AsyncIterator
from contextlib import asynccontextmanager

from fastapi import FastAPI

from service.api import health, page, problems, reports, samples, schema
from service.api.drain import Drain
from service.api.headers import FixedHeaders
from service.api.metrics import Measured, Metrics
from service.api.state import State
from service.settings import Settings
from service.version import version
from service.work.lane import Task
from service.work.report import report_bytes
from service.work.workers import Workers


def create_app(settings: Settings | None = None, *, task: Task = report_bytes) -> FastAPI:
    """The ASGI application; its worker processes run from start-up to shutdown.

    settings  None: from the environment
    task      what a worker does with (bytes, options); tests put a failing one here
    """
    settings = settings or Settings()
    workers = Workers(settings.workers, settings.max_waiting, settings.time_limit_s, task)
    metrics = Metrics(workers)

    @asynccontextmanager
    async def running(_: FastAPI) -> AsyncIterator[None]:
        try:
            await workers.start()
            yield
        finally:
            workers.stop()

    app = FastAPI(
        title="gainwright",
        version=version(),
        description="From a motor speed loop's log to a model with honest uncertainty and PI settings.",
        lifespan=running,
        # The stock documentation pages load their scripts from elsewhere.
        docs_url=None,
        redoc_url=None,
        redirect_slashes=False,
    )
    app.state.shared = State(settings, workers, metrics)
    for router in (health.router, reports.router, samples.router):
        app.include_router(router)
    page.install(app)
    problems.install(app)
    schema.install(app)
    # The last one added is the outermost.
    app.add_middleware(Drain)
    app.add_middleware(FixedHeaders)
    app.add_middleware(Measured, metrics=metrics)
    return app
