"""Health for whoever runs the service: alive, ready, figures."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from fastapi import APIRouter, Request, Response

from service.api.problems import documented
from service.api.state import state
from service.errors import ProblemError

router = APIRouter(tags=["health"])


@dataclass(frozen=True, slots=True)
class Alive:
    status: Literal["alive"] = "alive"


@dataclass(frozen=True, slots=True)
class Ready:
    workers: int
    status: Literal["ready"] = "ready"


@router.get("/healthz", summary="Is the process alive?", responses=documented(500))
async def healthz() -> Alive:
    return Alive()


@router.get("/readyz", summary="Can it take a log?", responses=documented(500, 503))
async def readyz(request: Request) -> Ready:
    service = state(request)
    if not service.workers.ready:
        raise ProblemError("not-ready", "The worker processes are not running yet. Ask again in a few seconds.")
    return Ready(workers=service.settings.workers)


@router.get(
    "/metrics",
    summary="Figures in the Prometheus text format",
    response_class=Response,
    responses={200: {"content": {"text/plain": {"schema": {"type": "string"}}}}, **documented(500)},
)
async def metrics(request: Request) -> Response:
    return state(request).metrics.text()
