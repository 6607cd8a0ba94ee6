"""Watch: drift of a loop, reckoned from the numbers of its reports whenever it is asked for.

Nothing of this is stored, so the order in which logs arrive cannot matter. A log with several reports counts once,
by the report that was asked for last; in the baseline, by the one that was named.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from statistics import median

import ident
from service.errors import ProblemError
from service.store import KeptLoop, KeptReport, Store
from service.work.loop_settings import LoopSettings
from service.work.numbers import Numbers, Units, read_numbers
from service.work.watched import Watched, period_of, watched


@dataclass(frozen=True, slots=True)
class Verdict:
    """One night's verdict, margin only on the last; `unusable`: why its numbers could not be compared."""

    report: KeptReport
    drift: ident.Drift
    unusable: str | None


@dataclass(frozen=True, slots=True)
class LoopDrift:
    """nights: those behind the baseline, in order;  now: the last one's verdict, or the baseline alone.

    seen_in   report whose log shows the controller, where its settings are not told
    """

    now: ident.Drift
    nights: tuple[Verdict, ...]
    seen_in: str | None


@dataclass(frozen=True, slots=True)
class _Baseline:
    """The named reports, with the controller whose margins are watched."""

    reports: tuple[KeptReport, ...]
    nights: tuple[ident.Night, ...]
    watched: Watched
    period: float
    units: Units
    settings: LoopSettings

    def drift(self) -> ident.Drift:
        """The baseline against nothing: its own values, and the settings whose margins count."""
        return ident.drift(
            self.nights,
            None,
            settings=self.watched.settings,
            settings_from=self.watched.source,
            period=self.period,
            compute_delay=self.watched.delay,
            target=self.settings.defaults.Ms,
            practical=_practical(self.settings),
            significance=self.settings.watch.significance,
        )


def check_baseline(store: Store, loop: KeptLoop, report_ids: Sequence[str]) -> ident.Drift:
    """The baseline that these reports would be.

    Raises ProblemError: no-such-report, other-loop, same-log, night-unusable, ...; ident.IdentError of `drift`.
    """
    return _named(store, loop, report_ids).drift()


def drift(store: Store, loop: KeptLoop) -> LoopDrift:
    """Whether a loop has moved from its baseline, night by night.

    Raises ProblemError: no-baseline, ...; ident.IdentError of `drift`.
    """
    if not loop.baseline:
        raise ProblemError(
            "no-baseline",
            "This loop has no baseline to compare with. Name some nights of ordinary work by "
            'PUT .../baseline with {"report_ids": [...]}; the history lists them.',
        )
    baseline = _baseline(store, loop)
    settings = baseline.settings
    later = _later(store, loop, baseline.reports)
    nights = [night_of(read_numbers(report.numbers), baseline.nights[0].gain_unit) for report in later]
    found = ident.drift_history(
        baseline.nights,
        # Their place among the later ones, written so that it sorts as text.
        [(f"{i:09d}", night) for i, (night, _) in enumerate(nights)],
        settings=baseline.watched.settings,
        settings_from=baseline.watched.source,
        period=baseline.period,
        compute_delay=baseline.watched.delay,
        target=settings.defaults.Ms,
        practical=_practical(settings),
        significance=settings.watch.significance,
    )
    verdicts = tuple(
        Verdict(report, said, why) for report, (_, said), (_, why) in zip(later, found, nights, strict=True)
    )
    return LoopDrift(verdicts[-1].drift if verdicts else baseline.drift(), verdicts, baseline.watched.seen_in)


def proposed(store: Store, loop: KeptLoop) -> tuple[ident.PidSettings | None, Units]:
    """The settings that would be proposed for the baseline's plant, and its units; errors as for `drift`."""
    baseline = _baseline(store, loop)
    margin = baseline.drift().margin
    return margin.settings if margin else None, baseline.units


def _baseline(store: Store, loop: KeptLoop) -> _Baseline:
    return _named(store, loop, loop.baseline)


def _named(store: Store, loop: KeptLoop, report_ids: Sequence[str]) -> _Baseline:
    settings = LoopSettings.model_validate_json(loop.settings)
    reports = store.reports.of(report_ids)
    missing = sorted(set(report_ids) - {report.id for report in reports})
    if missing:
        raise ProblemError("no-such-report", f"There is no report {missing[0]}; the loop's history lists them.")
    for report in reports:
        if report.loop != loop.name:
            raise ProblemError(
                "other-loop", f"Report {report.id} belongs to another loop, {report.loop!r}. Name reports of this one."
            )
    if len({report.sha256 for report in reports}) < len(reports):
        raise ProblemError("same-log", "Two of these reports are of one log, which must not count twice. Name one.")
    numbers = [read_numbers(report.numbers) for report in reports]
    nights = []
    for report, one in zip(reports, numbers, strict=True):
        night, why = night_of(one, None)
        if night is None:
            raise ProblemError("night-unusable", f"Report {report.id} cannot be part of a baseline: {why}")
        nights.append(night)
    return _Baseline(
        tuple(reports),
        tuple(nights),
        watched(store, loop, settings, numbers[0].units),
        median(period_of(settings, one) for one in numbers),
        numbers[0].units,
        settings,
    )


def _later(store: Store, loop: KeptLoop, baseline: Sequence[KeptReport]) -> list[KeptReport]:
    """One report of each log that stands behind the baseline's last, in history's order."""
    last = baseline[-1]
    chosen: dict[str, KeptReport] = {}
    for report in store.reports.history(loop.name):
        if (report.place, report.sha256) > (last.place, last.sha256):
            chosen[report.sha256] = report  # reports of one log come in the order they were asked for
    return list(chosen.values())


def night_of(numbers: Numbers, gain_unit: str | None) -> tuple[ident.Night | None, str | None]:
    """A night to compare, or why it is none; a gain in another unit than the baseline's cannot be compared."""
    plant = numbers.plant
    if plant is None:
        return None, numbers.reason
    if gain_unit is not None and plant.gain_unit != gain_unit:
        return (
            None,
            f'Its gain is in "{plant.gain_unit}", the baseline\'s in "{gain_unit}": bring the logs to one unit.',
        )
    try:
        night = ident.Night.from_values(
            plant.values,
            plant.names,
            plant.matrix,
            gain_unit=plant.gain_unit,
            input_correlation_p=plant.input_correlation_p,
            rubbing=plant.rubbing,
        )
        return night, None
    except ident.IdentError as error:
        return None, error.message


def _practical(settings: LoopSettings) -> ident.PracticalSize:
    return ident.PracticalSize(**settings.watch.practical.model_dump())
