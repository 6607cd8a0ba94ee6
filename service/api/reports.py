"""POST /v1/reports: a log in, its report out, nothing kept; POST /v1/logs/preview: how it would be understood."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Query, Request, Response

import ident
from service.api.body import FIELD, received
from service.api.problems import documented
from service.api.state import state
from service.errors import Problem, ProblemError
from service.work.options import Options
from service.work.previewing import preview_bytes

router = APIRouter(prefix="/v1", tags=["reports"])

UPLOAD: dict[str, Any] = {
    "requestBody": {
        "required": True,
        "description": "The log, plain or with Content-Encoding gzip or zstd, or a form with it in the field `file`.",
        "content": {
            "text/csv": {"schema": {"type": "string"}},
            "multipart/form-data": {
                "schema": {
                    "type": "object",
                    "properties": {FIELD: {"type": "string", "format": "binary"}},
                    "required": [FIELD],
                    "additionalProperties": False,
                }
            },
        },
    }
}


@router.post(
    "/reports",
    summary="Analyse a log",
    response_model=ident.Report,
    responses=documented(400, 408, 413, 415, 422, 500, 503),
    openapi_extra=UPLOAD,
)
async def post_report(request: Request, options: Annotated[Options, Query()]) -> Response:
    """The report of a step test or a closed-loop log: model, settings, margins, findings.

    A log that can be read but has nothing in it to learn from is answered with 200 too; its report says so.
    """
    service = state(request)
    with service.workers.admit():
        async with received(request) as log:
            answer = await service.workers.run(log, options)
    service.metrics.analysed(answer)
    if isinstance(answer, Problem):
        raise ProblemError.of(answer)
    return Response(answer, media_type="application/json")


@router.post(
    "/logs/preview",
    summary="What a log would be understood as",
    response_model=ident.Preview,
    responses=documented(400, 408, 413, 415, 422, 500, 503),
    openapi_extra=UPLOAD,
)
async def preview_log(request: Request, options: Annotated[Options, Query()]) -> Response:
    """Stamps, sample time and jitter, which header became which column and why, rows left out, gaps, steps of values.

    Nothing is fitted and nothing is kept; options that are not about reading do not count.
    """
    service = state(request)
    with service.workers.admit():
        async with received(request) as log:
            answer = await service.workers.run(log, options, preview_bytes)
    if isinstance(answer, Problem):
        raise ProblemError.of(answer)
    return Response(answer, media_type="application/json")
