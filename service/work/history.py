"""History: what a loop's reports say over time, with the margins of one controller on each log's plant."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import ident
from service.store import KeptLoop, KeptReport, Store
from service.work.loop_settings import LoopSettings
from service.work.numbers import Numbers, Units, read_numbers
from service.work.watch import night_of, proposed
from service.work.watched import Source, Watched, period_of, watched


@dataclass(frozen=True, slots=True)
class HistoryRow:
    """margins: that `margins_of` would have on this log's plant: told as installed, seen in a log, or the baseline's.

    interval   of Ms over the plants that this log allows; None where the fit has no covariance
    """

    report: KeptReport
    numbers: Numbers
    margins: ident.Margins | None
    interval: ident.MarginInterval | None
    margins_of: Source | None


def history(store: Store, loop: KeptLoop, after: KeptReport | None, limit: int) -> list[HistoryRow]:
    """Rows of a loop's reports in the order of its logs' own time."""
    settings = LoopSettings.model_validate_json(loop.settings)
    reports = store.reports.history(loop.name, after, limit)
    rows = [(report, read_numbers(report.numbers)) for report in reports]
    controllers = {units: _controller(store, loop, settings, units) for units in {one.units for _, one in rows}}
    return [_row(report, numbers, controllers[numbers.units], settings) for report, numbers in rows]


def _controller(store: Store, loop: KeptLoop, settings: LoopSettings, units: Units) -> Watched:
    """The one for logs in these units: a gain told by a log in others would mean something else."""
    found = watched(store, loop, settings, units)
    if found.settings is not None or not loop.baseline:
        return found
    own, baseline_units = proposed(store, loop)
    return Watched(own if units == baseline_units else None, "baseline")


def _row(report: KeptReport, numbers: Numbers, controller: Watched, settings: LoopSettings) -> HistoryRow:
    period = period_of(settings, numbers)
    margins = _margins(numbers.model_of_plant, controller.settings, period, controller.delay)
    if margins is None:
        return HistoryRow(report, numbers, None, None, None)
    night, _ = night_of(numbers, None)
    interval = _interval(night, controller.settings, period, controller.delay)
    return HistoryRow(report, numbers, margins, interval, controller.source)


@lru_cache(maxsize=20_000)
def _margins(
    plant: ident.Fopdt | None, settings: ident.PidSettings | None, period: float, delay: float
) -> ident.Margins | None:
    if plant is None or settings is None:
        return None
    try:
        return ident.margins(plant, settings, period=period, compute_delay=delay)
    except ident.IdentError:
        return None  # no margin can be told of such a loop, which is what None says


@lru_cache(maxsize=20_000)
def _interval(
    night: ident.Night | None, settings: ident.PidSettings | None, period: float, delay: float
) -> ident.MarginInterval | None:
    if night is None or settings is None:
        return None
    return ident.margin_interval(night, settings, period=period, compute_delay=delay)
