"""analyse: the whole order of work, from a record to its report."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from importlib.metadata import PackageNotFoundError, version
from typing import Any

from ident.errors import NotIdentifiable, Refused
from ident.estimate import Fit, Hold, Recovered, applied, fit_all, recover, spread_of
from ident.findings import Finding
from ident.judge import (
    CrossChecks,
    advice,
    believed,
    choose,
    cross_check,
    excitation,
    load_moved,
    mixed,
    operations,
    sustained,
    unlogged_setpoint,
)
from ident.loop import PidSettings
from ident.record import LoopRecord
from ident.report.allowed import allowed
from ident.report.cautions import CAUTIONS
from ident.report.curves import curves
from ident.report.installed import installed_loop, installed_outcome, installed_report
from ident.report.log import log_info, record_info
from ident.report.shape import FitReport, Report
from ident.report.tunings import tuning_reports
from ident.tune import Cloud, Proposals, propose


def analyse(
    record: LoopRecord,
    *,
    model: str = "auto",
    hold: Hold | None = None,
    Ms: float = 1.6,
    form: str = "pi",
    goal: str = "integral",
    period: float | None = None,
    compute_delay: float = 0.0,
    robust: bool | None = None,
    seed: int = 0,
    subspace: bool = True,
    installed: PidSettings | None = None,
    command_limits: tuple[float | None, float | None] = (None, None),
    on_stage: Callable[[str], None] = lambda _: None,
) -> Report:
    """Everything one record says: model, proposals, margins, predicted outcome.

    model          fopdt, sopdt, or auto to let the data choose
    hold           what the command did between samples: zero-order, linear, or None to let the data choose
    Ms             robustness target: max(Ms, Mt) of a proposal is at most this
    form, goal     pi, pid; integral (the largest ki), load, setpoint (the least IAE after a unit step of either)
    period         s, of the controller; None: as seen in the log, else its sample time,
                   with a finding; 0 for an analogue controller
    compute_delay  s, from reading the speed to writing the command
    robust         True: settings that hold the target on 95 % of the plants that the log allows; None: where the log
                   leaves the plant open (95 % of them stay only below 1.1 times the target); False: never
    seed           of every random draw: the same record and options give the same report
    subspace       cross-check the model by a subspace method too, which is slow to load the first time
    installed      settings told to be in the machine; compared with those that a closed-loop log shows
    command_limits (low, high) of the command, where known: a test that is advised stays within them, and a logged
                   command beyond them is taken as having been cut there
    on_stage       called with fitting, judging, tuning as each begins; tuning only where there is a model

    A record with too little in it gives a report without fits that says so. Raises Refused for options without
    an answer.
    """
    options: dict[str, float | int | str | None] = {
        "model": model,
        "hold": hold,
        "Ms": Ms,
        "form": form,
        "goal": goal,
        "period": period,
        "compute_delay": compute_delay,
        "robust": robust,
        "seed": seed,
    }
    found: list[Finding] = []
    on_stage("fitting")
    reached, limited = applied(record, command_limits)
    found += limited
    fits, refused = _fit(reached, model, hold)
    on_stage("judging")
    guess = fits
    if fits:
        fits, refused = believed(reached, fits)
    choice = choose(fits, model == "auto") if fits else None
    fitted = fits[choice.index] if choice else None
    recovered, seen = recover(record)
    held, assumed = _period(record, period, recovered)
    proposal: Proposals | None = None
    cloud: Cloud | None = None
    checked = CrossChecks((), ())
    if fitted is not None:
        checked = cross_check(reached, fitted, subspace=subspace)
        found += [*assumed, *unlogged_setpoint(fitted), *checked.findings]
        on_stage("tuning")
        timing = {"period": held, "compute_delay": compute_delay}
        cloud = allowed(fitted, seed=seed, **timing)
        proposal, untunable = _propose(fitted, Ms=Ms, form=form, goal=goal, allowed=cloud, robust=robust, **timing)
        found += untunable
    else:
        assert refused is not None
        found.append(Finding(refused.code, "error", refused.message, refused.evidence))
    in_machine, compared = installed_report(recovered, installed, fitted, period=held, compute_delay=compute_delay)
    if in_machine is not None and fitted is not None:
        in_machine = replace(in_machine, predicted=installed_outcome(in_machine, fitted, held, compute_delay))
    operated = operations(record, recovered)
    swings = sustained(record)
    found += [*mixed(record, operated), *swings, *(() if swings else load_moved(record, operated)), *seen, *compared]
    moved = excitation(record, refused)
    advised = None if moved.sufficient else advice(record, guess[0] if guess else None, command_limits)
    tunings = tuning_reports(
        record,
        proposal,
        fits,
        choice.index if choice else None,
        cloud,
        target=Ms,
        command_limits=command_limits,
        seed=seed,
        period=held,
        compute_delay=compute_delay,
    )
    return Report(
        engine_version=_engine(),
        log=log_info(record),
        record=record_info(record, moved, advised, operated),
        fits=tuple(_fit_report(f) for f in fits),
        selected=choice.index if choice else None,
        selected_because=choice.because if choice else "",
        installed=in_machine,
        tunings=tunings,
        recommended=proposal.recommended if proposal else None,
        recommended_because=proposal.because if proposal else "",
        curves=curves(
            record,
            fitted,
            tunings,
            period=held,
            compute_delay=compute_delay,
            installed=installed_loop(recovered, installed, fitted, period=held, compute_delay=compute_delay),
        ),
        findings=tuple(found),
        cautions=CAUTIONS,
        cross_checks=checked.checks,
        options=options,
        rules=proposal.rules if proposal else (),
    )


def _fit(record: LoopRecord, model: str, hold: Hold | None) -> tuple[tuple[Fit, ...], NotIdentifiable | None]:
    try:
        return fit_all(record, model, hold=hold), None
    except NotIdentifiable as error:
        return (), error


def _period(record: LoopRecord, period: float | None, recovered: Recovered | None) -> tuple[float, list[Finding]]:
    if period is not None:
        if not 0.0 <= period < float("inf"):
            raise Refused("period-out-of-range", f"The controller's period is a time in s, 0 or more; not {period}.")
        return period, []
    if recovered is not None:
        seen = recovered.period_s
        return seen, [
            Finding(
                "period-seen",
                "info",
                f"The controller's period was not given: {seen:.4g} s, at which the log shows it to answer, was taken.",
                {"period_s": seen},
            )
        ]
    step = record.sample_time or float(record.time[-1] - record.time[0]) / max(record.rows - 1, 1)
    return step, [
        Finding(
            "period-assumed",
            "warning",
            f"The controller's period was not given: the log's sample time, {step:.4g} s, was taken for it. A slower "
            "controller has less margin than stated here: give its period (0 for an analogue one).",
            {"period_s": step},
        )
    ]


def _propose(fitted: Fit, **asked: Any) -> tuple[Proposals | None, list[Finding]]:
    """Proposals for a fit, asked as for `propose`; none, with the reason, for a plant that has no answer."""
    try:
        return propose(fitted.model, **asked), []
    except Refused as error:
        if error.code not in ("unbounded", "target-unreachable"):
            raise
        # A property of this plant, not of the request: the model still stands.
        return None, [Finding(error.code, "warning", error.message, error.evidence)]


def _fit_report(fitted: Fit) -> FitReport:
    return FitReport(
        fitted.name,
        fitted.parameters,
        fitted.derived,
        fitted.covariance,
        fitted.friction,
        fitted.statistics,
        fitted.findings,
        spread_of(fitted),
    )


def _engine() -> str:
    try:
        return version("gainwright")
    except PackageNotFoundError:  # the library used from a bare folder
        return "unknown"
