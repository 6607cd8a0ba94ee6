"""A card's parts to its settings and margins."""

from __future__ import annotations

from pydantic import TypeAdapter

import ident
from service.errors import Problem
from service.work.kept_plant import plant_of
from service.work.numbers import parse
from service.work.options import Options
from service.work.realising import CardOptions
from service.work.report import told

_card = TypeAdapter(ident.CardReport)


def card_bytes(report: bytes, options: Options) -> bytes | Problem:
    """JSON of a CardReport, or the problem that stands in its way. Never raises.

    report   JSON of a kept report, b"" where the plant is given;  options  CardOptions
    """
    return told(lambda: _card.dump_json(_judge(report, options)))


def _judge(report: bytes, options: Options) -> ident.CardReport:
    assert isinstance(options, CardOptions)
    asked = options.card
    plant = asked.plant.model() if asked.plant else plant_of(parse(report))
    return ident.card_as_found(
        plant,
        ident.Parts(**asked.parts.model_dump()),
        Ms=asked.Ms,
        scale=asked.scale,
        limits=asked.limits,
        R_tolerance=asked.R_tolerance,
        C_tolerance=asked.C_tolerance,
    )
