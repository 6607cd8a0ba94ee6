"""Logs of a loop: kept, analysed, listed."""

from __future__ import annotations

import json
from dataclasses import dataclass
from datetime import datetime
from typing import Annotated, Any, Literal

from fastapi import APIRouter, Query, Request, Response

from service.api.body import received
from service.api.loops import existing
from service.api.names import LoopName
from service.api.paging import LINK, After, Limit, page
from service.api.prefer import wait_seconds
from service.api.problems import documented
from service.api.reports import UPLOAD
from service.api.state import state
from service.errors import Problem, ProblemError
from service.store import Analysis as Kept
from service.store import KeptLog
from service.work.keep import keep
from service.work.options import Options

router = APIRouter(prefix="/v1", tags=["logs"])

RETRY_AFTER_S = 1


@dataclass(frozen=True, slots=True)
class Analysis:
    """One log with one set of options, on its way to a report.

    stage     queued, then reading, fitting, judging, tuning, storing; at the end done or failed
    progress  share of the stages left behind, 0 to 1
    options   what it is done with, the loop's settings counted in; what is not named has its default
    """

    id: str
    loop: str
    log_id: str
    status: Literal["queued", "running", "done", "failed"]
    stage: str
    progress: float
    report_id: str | None
    problem: Problem | None
    options: dict[str, float | int | str | None]
    created: datetime
    finished: datetime | None

    @classmethod
    def of(cls, kept: Kept) -> Analysis:
        return cls(
            kept.id, kept.loop, kept.log_id, kept.status, kept.stage, kept.progress, kept.report_id, kept.problem,
            json.loads(kept.options), kept.created, kept.finished,
        )  # fmt: skip

    @property
    def ended(self) -> bool:
        return self.status in ("done", "failed")


@dataclass(frozen=True, slots=True)
class Log:
    """One kept log and what was asked of it."""

    id: str
    loop: str
    sha256: str
    size_bytes: int
    received: datetime
    analyses: tuple[Analysis, ...]


KEEPING: dict[str, Any] = {
    "requestBody": UPLOAD["requestBody"],
    "parameters": [
        {
            "name": "Prefer",
            "in": "header",
            "description": "wait=N: answer when the analysis has ended, or after N seconds (RFC 7240).",
            "schema": {"type": "string"},
        }
    ],
}
HEADERS: dict[str, Any] = {
    "Location": {"description": "Where the analysis is.", "schema": {"type": "string"}},
    "Preference-Applied": {"description": "The preference that was followed.", "schema": {"type": "string"}},
}
OUTCOMES: dict[int | str, dict[str, Any]] = {
    200: {"model": Analysis, "description": "This log was here already, with these options.", "headers": HEADERS},
    201: {"model": Analysis, "description": "Kept, and the analysis has ended.", "headers": HEADERS},
    202: {"model": Analysis, "description": "Kept; the analysis has not ended yet.", "headers": HEADERS},
}


@router.post(
    "/loops/{loop}/logs",
    summary="Keep a log and analyse it",
    status_code=202,
    responses={**OUTCOMES, **documented(400, 408, 413, 415, 422, 500, 503)},
    openapi_extra=KEEPING,
)
async def post_log(
    request: Request, response: Response, loop: LoopName, options: Annotated[Options, Query()]
) -> Analysis:
    """The body as for /v1/reports. The loop is made if it is new; its settings stand in for options not given.

    Once this is answered with 2xx the log is safe: it ends as done or failed whatever happens to the service. The
    same bytes with the same options are kept once. A log that cannot be read is kept too; its analysis fails and
    says why.
    """
    service = state(request)
    with service.workers.admit():
        async with received(request) as log:
            accepted = await keep(service.store, service.dispatcher, loop, log, options)
    found = accepted.analysis
    seconds = wait_seconds(request.headers.getlist("prefer"))
    if seconds is not None:
        found = await service.dispatcher.wait(found, seconds)
        response.headers["Preference-Applied"] = f"wait={seconds}"
    analysis = Analysis.of(found)
    response.headers["Location"] = f"/v1/analyses/{analysis.id}"
    if not analysis.ended:
        response.headers["Retry-After"] = str(RETRY_AFTER_S)
    response.status_code = 200 if not accepted.new else 201 if analysis.ended else 202
    return analysis


@router.get(
    "/loops/{loop}/logs", summary="The logs of a loop", responses={200: {"headers": LINK}, **documented(404, 422, 500)}
)
def list_logs(
    request: Request, response: Response, loop: LoopName, limit: Limit = 100, after: After = None
) -> list[Log]:
    """In order of arrival, each with its analyses."""
    store = state(request).store
    existing(store, loop)
    last = None if after is None else store.logs.get(after)
    if after is not None and (last is None or last.loop != loop):
        raise ProblemError("no-such-page", "This loop has no log of the id in `after`. Begin with the first page.")
    found = store.logs.page(loop, last.number if last else 0, limit + 1)
    return [_log(*one) for one in page(request, response, found, limit, lambda one: one[0].id)]


@router.get("/analyses/{id}", summary="One analysis", responses=documented(404, 422, 500))
def get_analysis(request: Request, response: Response, id: str) -> Analysis:
    """How far it is; while it has not ended, Retry-After says when to ask again."""
    kept = state(request).store.logs.analysis(id)
    if kept is None:
        raise ProblemError("no-such-analysis", "There is no analysis of this id. The loop's logs list theirs.")
    analysis = Analysis.of(kept)
    if not analysis.ended:
        response.headers["Retry-After"] = str(RETRY_AFTER_S)
    return analysis


def _log(log: KeptLog, analyses: tuple[Kept, ...]) -> Log:
    return Log(log.id, log.loop, log.sha256, log.size_bytes, log.received, tuple(map(Analysis.of, analyses)))
