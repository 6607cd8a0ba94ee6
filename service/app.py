"""create_app: the service put together from its settings."""

from __future__ import annotations

from collections.abc import AsyncIterator
from contextlib import asynccontextmanager

from fastapi import FastAPI

from service.api import cards, health, kept, logs, loops, page, problems, reports, samples, schema, watch
from service.api.drain import Drain
from service.api.headers import FixedHeaders
from service.api.metrics import Measured, Metrics
from service.api.small import SmallBodies
from service.api.state import State
from service.settings import Settings
from service.store import Store
from service.version import version
from service.work.dispatcher import Dispatcher
from service.work.lane import Task
from service.work.report import report_bytes
from service.work.workers import Workers


def create_app(settings: Settings | None = None, *, task: Task = report_bytes) -> FastAPI:
    """The ASGI application; its worker processes run from start-up to shutdown.

    settings  None: from the environment
    task      what a worker does with (a log's file, options); tests put a failing one here
    """
    settings = settings or Settings()
    workers = Workers(settings.workers, settings.max_waiting, settings.time_limit_s, task)
    metrics = Metrics(workers)
    store = Store(settings.data_dir, settings.database_url)
    dispatcher = Dispatcher(store, workers, metrics.analysed)

    @asynccontextmanager
    async def running(_: FastAPI) -> AsyncIterator[None]:
        store.open()
        try:
            await workers.start()
            await dispatcher.start()
            yield
        finally:
            await dispatcher.stop()
            workers.stop()
            store.close()

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
    app.state.shared = State(settings, workers, metrics, store, dispatcher)
    for room in (health, reports, kept, cards, loops, logs, watch, samples):
        app.include_router(room.router)
    page.install(app)
    problems.install(app)
    schema.install(app)
    # The last one added is the outermost.
    app.add_middleware(SmallBodies)
    app.add_middleware(Drain)
    app.add_middleware(FixedHeaders)
    app.add_middleware(Measured, metrics=metrics)
    return app
