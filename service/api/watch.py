"""Watching a loop: its history, its baseline, and whether it has moved."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from typing import Annotated, Literal

from fastapi import APIRouter, Body, Request, Response
from pydantic import BaseModel, ConfigDict, Field

import ident
from service.api.kept import place_of
from service.api.loops import Loop, existing, problem_of
from service.api.names import LoopName
from service.api.paging import LINK, After, Limit, page
from service.api.problems import documented
from service.api.state import state
from service.store import KeptReport
from service.work import history, watch
from service.work.numbers import Movement, Parameter
from service.work.watched import Source

router = APIRouter(prefix="/v1/loops/{loop}", tags=["watching"])

ReportId = Annotated[str, Field(min_length=1, max_length=40)]
Said = Literal["moved", "not-moved", "no-news"]


@dataclass(frozen=True, slots=True)
class Excited:
    sufficient: bool
    reason: str


@dataclass(frozen=True, slots=True)
class Row:
    """What one report says, for a history.

    at         where the log stands: its own time, or that of its receipt where it has none
    parameters, derived   of the model that the report chose;  first_order  K, T, L of the first-order fit beside it
    margins    that the controller would have on this log's plant, taken as first order
    margins_interval   of its Ms over the plants that this log's covariance allows; null where there is none
    margins_of installed: the controller as set now; log: where none is set, the one that the latest log with a visible
               controller shows; baseline: where there is none either, the one proposed for the baseline
    proposed   settings that this report recommends
    """

    report_id: str
    analysis_id: str
    log_id: str
    start: datetime | None
    at: datetime
    duration_s: float
    model: str | None
    parameters: dict[str, Parameter]
    derived: dict[str, Parameter]
    first_order: dict[str, Parameter]
    fit_percent: float | None
    rms_residual: float | None
    speed_unit: str
    command_movement: Movement
    excitation: Excited
    margins: ident.Margins | None
    margins_interval: ident.MarginInterval | None
    margins_of: Source | None
    proposed: dict[str, float] | None
    in_baseline: bool


class BaselineIds(BaseModel):
    """Reports of this loop, of different logs; none at all ends the watching."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    report_ids: list[ReportId] = Field(max_length=1000)


@dataclass(frozen=True, slots=True)
class MovedParameter:
    """statistic, threshold: squared change over its variance, and what it is held to; the rest in `unit`.

    practical  the least change that counts;  visible  the least that this log would have shown as often as not
    since      time of the first log of the run of "moved" that is on
    """

    verdict: Said
    statistic: float | None
    threshold: float | None
    since: datetime | None
    baseline: float
    now: float | None
    change: float | None
    practical: float
    visible: float | None
    unit: str


@dataclass(frozen=True, slots=True)
class Margin:
    """Ms of the controller on the baseline's plant and on the last log's, with its 95 % interval.

    An end of the interval is null where the loop is unstable there; unstable_share says for how much.
    settings_from    as margins_of in the history;  seen_in  the report whose log shows them, with "log"
    """

    Ms_baseline: float | None
    Ms_now: float | None
    ci95: tuple[float | None, float | None]
    target: float
    unstable_share: float | None
    settings: ident.PidSettings
    settings_from: Source
    seen_in: str | None


@dataclass(frozen=True, slots=True)
class NightVerdict:
    """unusable: why a log carries no news, where it could not be compared at all."""

    report_id: str
    at: datetime
    verdict: Said
    statistic: float | None
    threshold: float | None
    p: float | None
    unusable: str | None


@dataclass(frozen=True, slots=True)
class Drift:
    """Whether the loop has moved, by its last log.

    as_of             time of that log;  last_informative  time of the last log that had news, null where none had
    statistic         of all parameters together, held to threshold; p: chance of as much while nothing has moved
    since             time of the first log of the run of "moved" that is on
    nights            the logs behind the baseline, in the order of their own time
    """

    verdict: Said
    as_of: datetime | None
    last_informative: datetime | None
    since: datetime | None
    statistic: float | None
    threshold: float | None
    p: float | None
    parameters: dict[str, MovedParameter]
    margin: Margin | None
    baseline: tuple[str, ...]
    nights: tuple[NightVerdict, ...]
    findings: tuple[ident.Finding, ...]


@router.get(
    "/history",
    summary="What the reports say over time",
    responses={200: {"headers": LINK}, **documented(404, 422, 500)},
)
def get_history(
    request: Request, response: Response, loop: LoopName, limit: Limit = 500, after: After = None
) -> list[Row]:
    """One row per report, in the order of the logs' own time.

    A log without a time of its own stands at the time of its receipt. Equal times are ordered by the log's
    content, so that the order of uploads does not matter; reports of one log by when they were asked for.
    """
    store = state(request).store
    kept = existing(store, loop)
    try:
        found = history.history(store, kept, place_of(store, loop, after), limit + 1)
    except ident.IdentError as error:
        raise problem_of(error) from error
    shown = page(request, response, found, limit, lambda row: row.report.id)
    return [_row(row, row.report.id in kept.baseline) for row in shown]


@router.put(
    "/baseline",
    summary="Choose what later logs are compared with",
    responses=documented(400, 404, 413, 422, 500),
)
def put_baseline(request: Request, loop: LoopName, wanted: Annotated[BaselineIds, Body()]) -> Loop:
    """Several ordinary nights say more than one: their scatter adds to both sides of the comparison."""
    store = state(request).store
    kept = existing(store, loop)
    ids = sorted(set(wanted.report_ids))
    if ids:
        try:
            watch.check_baseline(store, kept, ids)
        except ident.IdentError as error:
            raise problem_of(error) from error
    store.loops.set_baseline(loop, ids)
    return Loop.of(existing(store, loop))


@router.get("/drift", summary="Has the loop moved?", responses=documented(404, 409, 422, 500))
def get_drift(request: Request, loop: LoopName) -> Drift:
    """The last log against the baseline: moved, not-moved, or no-news where it could not have shown a move.

    Compared are the logs that stand behind the last of the baseline's, each by its latest report.
    """
    store = state(request).store
    kept = existing(store, loop)
    try:
        found = watch.drift(store, kept)
    except ident.IdentError as error:
        raise problem_of(error) from error
    return _drift(kept.baseline, found)


def _row(row: history.HistoryRow, in_baseline: bool) -> Row:
    report, numbers = row.report, row.numbers
    return Row(
        report.id, report.analysis_id, report.log_id, report.start, report.place, numbers.duration_s,
        numbers.model, numbers.parameters, numbers.derived, numbers.first_order, numbers.fit_percent,
        numbers.rms_residual, numbers.speed_unit, numbers.movement, Excited(numbers.sufficient, numbers.reason),
        row.margins, row.interval, row.margins_of, numbers.proposed, in_baseline,
    )  # fmt: skip


def _drift(baseline: tuple[str, ...], found: watch.LoopDrift) -> Drift:
    now, nights = found.now, found.nights
    informative = [night.report.place for night in nights if night.drift.verdict != "no-news"]
    return Drift(
        verdict=now.verdict,
        as_of=nights[-1].report.place if nights else None,
        last_informative=informative[-1] if informative else None,
        since=_time(nights, now.since),
        statistic=now.statistic,
        threshold=now.threshold,
        p=now.p,
        parameters={name: _parameter(nights, one) for name, one in now.parameters.items()},
        margin=None if now.margin is None else _margin(now.margin, found.seen_in),
        baseline=baseline,
        nights=tuple(_night(night.report, night) for night in nights),
        findings=now.findings,
    )


def _parameter(nights: tuple[watch.Verdict, ...], one: ident.ParameterDrift) -> MovedParameter:
    return MovedParameter(
        one.verdict, one.statistic, one.threshold, _time(nights, one.since), one.baseline, one.tonight, one.change,
        one.practical, one.visible, one.unit,
    )  # fmt: skip


def _margin(told: ident.MarginDrift, seen_in: str | None) -> Margin:
    return Margin(
        told.Ms_baseline, told.Ms_now, told.ci95, told.target, told.unstable_share, told.settings, told.settings_from,
        seen_in,
    )  # fmt: skip


def _night(report: KeptReport, night: watch.Verdict) -> NightVerdict:
    said = night.drift
    return NightVerdict(report.id, report.place, said.verdict, said.statistic, said.threshold, said.p, night.unusable)


def _time(nights: tuple[watch.Verdict, ...], key: object) -> datetime | None:
    """The time of the night whose place among them, as text, is the key."""
    return None if key is None else nights[int(str(key))].report.place
