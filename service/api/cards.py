"""POST /v1/cards: the parts of an op-amp card as found, on a plant."""

from __future__ import annotations

import asyncio
from typing import Annotated

from fastapi import APIRouter, Body, Request, Response

import ident
from service.api.kept import found
from service.api.problems import documented
from service.api.state import state
from service.errors import Problem, ProblemError
from service.work.card import card_bytes
from service.work.realising import Card, CardOptions

router = APIRouter(prefix="/v1", tags=["reports"])


@router.post(
    "/cards",
    summary="Judge an op-amp controller card",
    response_model=ident.CardReport,
    responses=documented(400, 404, 413, 422, 500, 503),
)
async def post_card(request: Request, card: Annotated[Card, Body()]) -> Response:
    """Settings and margins of a card from its parts, and the fewest parts to change for a target. Nothing is kept."""
    if (card.plant is None) == (card.report_id is None):
        raise ProblemError("invalid-body", "Give the plant, or the report_id of a kept report: one of them, not both.")
    service = state(request)
    with service.workers.admit():
        body = b""
        if card.report_id is not None:
            _, body = await asyncio.to_thread(found, service.store, card.report_id)
        answer = await service.workers.run(body, CardOptions(card=card), card_bytes)
    if isinstance(answer, Problem):
        raise ProblemError.of(answer)
    return Response(answer, media_type="application/json")
