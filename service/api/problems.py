"""The one maker of error bodies: RFC 9457 problem+json with a stable `code`, whatever went wrong.

ProblemError            what the service and ident refuse     status by STATUS, 422 for the rest
RequestValidationError  options or a body that are wrong      422 invalid-option, invalid-body
HTTPException           no such address, method, ...          its own status
ClientDisconnect        nobody is left to read it             400 disconnected
Exception               a fault of the program                500 internal
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from http import HTTPStatus
from typing import Any

from fastapi import FastAPI
from fastapi.exceptions import RequestValidationError
from pydantic import TypeAdapter
from starlette.exceptions import HTTPException
from starlette.requests import ClientDisconnect, Request
from starlette.responses import Response

from service.errors import Problem, ProblemError, Value
from service.work.options import wrong_options

MEDIA_TYPE = "application/problem+json"

# Every other code is a log or an option that was understood and refused: 422.
STATUS = {
    "not-found": 404,
    "no-such-sample": 404,
    "no-such-loop": 404,
    "no-such-analysis": 404,
    "no-such-report": 404,
    "no-baseline": 409,
    "method-not-allowed": 405,
    "too-slow": 408,
    "too-large": 413,
    "unsupported-encoding": 415,
    "broken-gzip": 400,
    "broken-zstd": 400,
    "broken-multipart": 400,
    "bad-request": 400,
    "disconnected": 400,
    "internal": 500,
    "busy": 503,
    "worker-lost": 503,
    "time-limit": 503,
    "not-ready": 503,
}
HEADERS = {
    "busy": {"Retry-After": "5"},
    "worker-lost": {"Retry-After": "1"},
    "unsupported-encoding": {"Accept-Encoding": "gzip, zstd"},
}


@dataclass(frozen=True, slots=True)
class ProblemBody:
    """RFC 9457 problem details. `code` is stable; `detail` says what to do; `evidence` holds the figures."""

    title: str
    status: int
    detail: str
    code: str
    evidence: dict[str, Value]
    type: str = "about:blank"


_body = TypeAdapter(ProblemBody)


def respond(problem: Problem, headers: Mapping[str, str] | None = None) -> Response:
    """The answer to a request that has none."""
    status = HTTPStatus(STATUS.get(problem.code, 422))
    body = ProblemBody(status.phrase, status.value, problem.detail, problem.code, problem.evidence)
    return Response(
        _body.dump_json(body),
        status_code=status,
        media_type=MEDIA_TYPE,
        headers={**HEADERS.get(problem.code, {}), **(headers or {})},
    )


def documented(*statuses: int) -> dict[int | str, dict[str, Any]]:
    """`responses` of a route that may answer so (`schema` moves them to their media type)."""
    return {status: {"model": ProblemBody, "description": HTTPStatus(status).phrase} for status in statuses}


def install(app: FastAPI) -> None:
    """Make every error of `app` a problem."""

    @app.exception_handler(ProblemError)
    async def told(_: Request, error: ProblemError) -> Response:
        return respond(error.problem)

    @app.exception_handler(RequestValidationError)
    async def invalid(_: Request, error: RequestValidationError) -> Response:
        return respond(_wrong(error.errors()))

    @app.exception_handler(HTTPException)
    async def routed(request: Request, error: HTTPException) -> Response:
        return respond(_routing(request, error), error.headers)

    @app.exception_handler(ClientDisconnect)
    async def gone(_: Request, __: ClientDisconnect) -> Response:
        return respond(Problem("disconnected", "The connection ended before the log was complete."))

    @app.exception_handler(Exception)
    async def failed(_: Request, __: Exception) -> Response:
        return respond(Problem("internal", "The service failed by a fault of its own; its log says where."))


def _wrong(faults: Sequence[Any]) -> Problem:
    if not any(fault["loc"][0] == "body" for fault in faults):
        return wrong_options(faults)
    evidence: dict[str, Value] = dict(map(_fault, faults))
    told = "; ".join(f"{name}: {said}" for name, said in evidence.items())
    return Problem("invalid-body", f"Correct the body, which is JSON, and send it again. {told}.", evidence)


def _fault(fault: Any) -> tuple[str, str]:
    """Which member of a body is at fault, and why."""
    where, said = fault["loc"][1:], str(fault["msg"]).removeprefix("Value error, ")
    if fault["type"] == "json_invalid":
        return "body", f"no JSON from character {where[0]} on"
    return ".".join(map(str, where)) or "body", said


def _routing(request: Request, error: HTTPException) -> Problem:
    path, method = request.url.path, request.method
    if error.status_code == 404:
        return Problem("not-found", f"Nothing is found at {path}; /openapi.json lists what is.")
    if error.status_code == 405:
        return Problem("method-not-allowed", f"{path} does not take {method}; the header Allow says what it takes.")
    return Problem("bad-request", str(error.detail))
