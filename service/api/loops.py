"""Loops: what is known of each, so that its logs need not repeat it."""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Annotated, Any

from fastapi import APIRouter, Body, Request, Response
from pydantic import ConfigDict, Field, model_validator

import ident
from service.api.names import LoopName
from service.api.paging import LINK, After, Limit, page
from service.api.problems import documented
from service.api.state import state
from service.errors import ProblemError
from service.store import KeptLoop, Store
from service.work.loop_settings import LoopSettings

router = APIRouter(prefix="/v1/loops", tags=["loops"])


class Loop(LoopSettings):
    """A loop: its name, its settings, and what there is of it."""

    model_config = ConfigDict(json_schema_mode_override="serialization")

    loop: str
    created: datetime
    logs: int = Field(description="How many are kept.")
    baseline: tuple[str, ...] = Field(description="Ids of the reports that later logs are compared with.")

    @classmethod
    def of(cls, kept: KeptLoop) -> Loop:
        settings = LoopSettings.model_validate_json(kept.settings)
        return cls(
            loop=kept.name,
            created=kept.created,
            logs=kept.logs,
            baseline=kept.baseline,
            **{name: getattr(settings, name) for name in LoopSettings.model_fields},
        )


READ_ONLY = ("loop", "created", "logs", "baseline")


class PutLoop(LoopSettings):
    """A loop's settings. What GET gives can be sent back: what cannot be set here is passed over."""

    @model_validator(mode="before")
    @classmethod
    def _pass_over(cls, given: Any) -> Any:
        if not isinstance(given, dict):
            return given
        return {name: value for name, value in given.items() if name not in READ_ONLY}


def existing(store: Store, name: str) -> KeptLoop:
    """Raises ProblemError: no-such-loop."""
    kept = store.loops.get(name)
    if kept is None:
        raise ProblemError(
            "no-such-loop",
            "There is no loop of this name. Send it a log or its settings to make it; /v1/loops lists all.",
        )
    return kept


@router.get("", summary="The loops", responses={200: {"headers": LINK}, **documented(422, 500)})
def list_loops(request: Request, response: Response, limit: Limit = 100, after: After = None) -> list[Loop]:
    """In order of name."""
    found = state(request).store.loops.page(after or "", limit + 1)
    return [Loop.of(kept) for kept in page(request, response, found, limit, lambda kept: kept.name)]


@router.get("/{loop}", summary="One loop", responses=documented(404, 422, 500))
def get_loop(request: Request, loop: LoopName) -> Loop:
    return Loop.of(existing(state(request).store, loop))


@router.put(
    "/{loop}",
    summary="Set what is known of a loop",
    responses={201: {"model": Loop, "description": "The loop is new."}, **documented(400, 413, 422, 500)},
)
def put_loop(request: Request, response: Response, loop: LoopName, settings: Annotated[PutLoop, Body()]) -> Loop:
    """Replaces all settings; what is left out is unknown from now on. Reports that exist stay as they are.

    Later logs use the units, column names, zone, order of dates, period and defaults where nothing else comes with
    them. History and drift are reckoned with the settings as they stand. A test that is advised stays within the
    command's limits.
    """
    service = state(request)
    kept = LoopSettings(**{name: getattr(settings, name) for name in LoopSettings.model_fields})
    if service.store.loops.put(loop, kept.model_dump_json(), datetime.now(UTC)):
        response.status_code = 201
    return Loop.of(existing(service.store, loop))


def problem_of(error: ident.IdentError) -> ProblemError:
    """What ident refuses, as a problem."""
    return ProblemError(error.code, error.message, error.evidence)
