"""Kept reports: the very bytes, and other proposals from them."""

from __future__ import annotations

import asyncio
from dataclasses import dataclass
from datetime import datetime
from typing import Annotated, Literal

from fastapi import APIRouter, Body, Request, Response
from pydantic import BaseModel, ConfigDict, Field

import ident
from service.api.loops import existing
from service.api.names import LoopName, address
from service.api.paging import LINK, After, Limit, page
from service.api.problems import documented
from service.api.state import state
from service.errors import Problem, ProblemError
from service.store import KeptReport, Store
from service.work.realising import Realising
from service.work.retune import Retarget, Retuned, retuned_bytes

router = APIRouter(prefix="/v1", tags=["reports"])


class Wanted(BaseModel):
    """What is left out is as in the report."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    Ms: float | None = Field(
        default=None, gt=1.0, le=5.0, allow_inf_nan=False, description="Robustness target: max(Ms, Mt) at most this."
    )
    form: Literal["pi", "pid"] | None = None
    goal: Literal["integral", "load", "setpoint"] | None = None
    period: float | None = Field(
        default=None, ge=0.0, le=86_400.0, allow_inf_nan=False, description="Of the controller, s; 0 if analogue."
    )
    gain_margin: float | None = Field(
        default=None, gt=1.0, le=1000.0, allow_inf_nan=False, description="At least this factor."
    )
    phase_margin_deg: float | None = Field(
        default=None, gt=0.0, lt=90.0, allow_inf_nan=False, description="At least this, degrees."
    )
    closed_loop_s: float | None = Field(
        default=None, gt=0.0, allow_inf_nan=False, description="Time constant of the closed loop, s."
    )
    noise_peak: float | None = Field(
        default=None,
        gt=0.0,
        allow_inf_nan=False,
        description="Command units per speed unit of measurement noise, at any frequency, at most.",
    )
    command_noise_std: float | None = Field(
        default=None,
        gt=0.0,
        allow_inf_nan=False,
        description="Standard deviation of the command, command units, at most, given the noise seen in the log.",
    )
    overshoot_percent: float | None = Field(
        default=None, ge=0.0, le=100.0, allow_inf_nan=False, description="Allowed after a setpoint step."
    )
    realisation: Realising | None = Field(
        default=None, description="How the recommended proposal is to be carried out; left out: as in a report."
    )


@dataclass(frozen=True, slots=True)
class Listed:
    """A kept report without its contents."""

    report_id: str
    analysis_id: str
    log_id: str
    start: datetime | None
    sha256: str


@router.get("/reports/{id}", summary="One report", response_model=ident.Report, responses=documented(404, 422, 500))
def get_report(request: Request, id: str) -> Response:
    """Byte for byte what `gainwright report` prints for the same log and options; Link says whose it is."""
    store = state(request).store
    kept, body = found(store, id)
    whose = f'<{address(kept.loop)}>; rel="collection", </v1/analyses/{kept.analysis_id}>; rel="via"'
    return Response(body, media_type="application/json", headers={"Link": whose, "ETag": f'"{kept.id}"'})


@router.post(
    "/reports/{id}/tunings",
    summary="Another proposal from a kept fit",
    response_model=Retuned,
    responses=documented(400, 404, 413, 422, 500, 503),
)
async def post_tunings(request: Request, id: str, wanted: Annotated[Wanted, Body()]) -> Response:
    """For another target, form, goal or period, without fitting again; or the parts of a card. Nothing is kept."""
    service = state(request)
    with service.workers.admit():
        _, body = await asyncio.to_thread(found, service.store, id)
        options = Retarget(**wanted.model_dump(exclude_none=True))
        answer = await service.workers.run(body, options, retuned_bytes)
    if isinstance(answer, Problem):
        raise ProblemError.of(answer)
    return Response(answer, media_type="application/json")


@router.get(
    "/loops/{loop}/reports",
    summary="The reports of a loop",
    responses={200: {"headers": LINK}, **documented(404, 422, 500)},
)
def list_reports(
    request: Request, response: Response, loop: LoopName, limit: Limit = 100, after: After = None
) -> list[Listed]:
    """In the order of the logs' own time, as the history is."""
    store = state(request).store
    existing(store, loop)
    rows = store.reports.history(loop, place_of(store, loop, after), limit + 1)
    shown = page(request, response, rows, limit, lambda kept: kept.id)
    return [Listed(kept.id, kept.analysis_id, kept.log_id, kept.start, kept.sha256) for kept in shown]


def place_of(store: Store, loop: str, after: str | None) -> KeptReport | None:
    """The report that a page of this loop begins behind. Raises ProblemError: no-such-page."""
    if after is None:
        return None
    kept = store.reports.get(after)
    if kept is None or kept.loop != loop:
        raise ProblemError("no-such-page", "This loop has no report of the id in `after`. Begin with the first page.")
    return kept


def found(store: Store, id: str) -> tuple[KeptReport, bytes]:
    """A kept report and its JSON. Raises ProblemError: no-such-report."""
    kept, body = store.reports.get(id), store.reports.body(id)
    if kept is None or body is None:
        raise ProblemError("no-such-report", "There is no report of this id. The loop's history lists its reports.")
    return kept, body
