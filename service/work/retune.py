"""Retune: other proposals from a report that was kept, without fitting again."""

from __future__ import annotations

from dataclasses import dataclass

from pydantic import TypeAdapter

import ident
from service.errors import Problem
from service.work.kept_plant import plant_of
from service.work.numbers import numbers_of, parse
from service.work.options import Options
from service.work.report import told


@dataclass(frozen=True, slots=True)
class Retuned:
    """Proposals for a kept fit, as in its report; options: what they were made for.

    worst_case of each is None: the plants that it is taken over are drawn while the log is at hand.
    """

    options: dict[str, float | int | str | None]
    tunings: tuple[ident.TuningReport, ...]
    recommended: int | None
    recommended_because: str


_retuned = TypeAdapter(Retuned)


def retuned_bytes(report: bytes, options: Options) -> bytes | Problem:
    """JSON of a Retuned for a report's JSON, or the problem that stands in its way. Never raises.

    What the options leave open is as in the report; those of reading and fitting do not count.
    """
    return told(lambda: _retuned.dump_json(_retune(report, options)))


def _retune(report: bytes, given: Options) -> Retuned:
    parsed = parse(report)
    plant = plant_of(parsed)
    before = parsed["options"]
    asked = {
        name: getattr(given, name) if name in given.model_fields_set else before[name]
        for name in ("Ms", "form", "goal", "period")
    }
    period = numbers_of(parsed).period_s if asked["period"] is None else asked["period"]
    delay = before["compute_delay"]
    found = ident.propose(
        plant,
        Ms=asked["Ms"],
        form=asked["form"],
        goal=asked["goal"],
        period=period or 0.0,
        compute_delay=delay,
    )
    tunings = tuple(
        ident.TuningReport(t.method, t.form, t.settings, t.margins, None, t.predicted, {}, t.findings)
        for t in found.tunings
    )
    return Retuned({**asked, "compute_delay": delay}, tunings, found.recommended, found.because)
