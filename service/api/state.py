"""What the routes share: the settings, the workers, the store, the figures."""

from __future__ import annotations

from dataclasses import dataclass

from fastapi import Request

from service.api.metrics import Metrics
from service.settings import Settings
from service.store import Store
from service.work.dispatcher import Dispatcher
from service.work.workers import Workers


@dataclass(frozen=True, slots=True)
class State:
    """Made once by `create_app`."""

    settings: Settings
    workers: Workers
    metrics: Metrics
    store: Store
    dispatcher: Dispatcher


def state(request: Request) -> State:
    shared: State = request.app.state.shared
    return shared
