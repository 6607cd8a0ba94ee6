"""Tunings: each proposal with what the log's own plants, limits and other models make of it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from ident.estimate import Fit
from ident.findings import Finding
from ident.loop import PidSettings, margins
from ident.realise import realise
from ident.record import LoopRecord
from ident.report.largest_move import largest_move
from ident.report.shape import TuningReport
from ident.tune import Cloud, LimitedOutcome, Proposals, Tuning, lagged, limited_outcome, saturates

NOTABLE = 0.05  # above the target, on another accepted model, that is worth a word


def tuning_reports(
    record: LoopRecord,
    proposal: Proposals | None,
    fits: Sequence[Fit],
    selected: int | None,
    allowed: Cloud | None,
    *,
    target: float,
    command_limits: tuple[float | None, float | None],
    seed: int,
    period: float,
    compute_delay: float,
) -> tuple[TuningReport, ...]:
    """The proposals for one fit, in their order.

    fits, selected  the simplest first, and the index of the one that was tuned for;  allowed  the plants of the log
    """
    if proposal is None or selected is None:
        return ()
    fitted = fits[selected]
    timing: dict[str, Any] = {"period": period, "compute_delay": compute_delay}
    out = []
    for i, t in enumerate(proposal.tunings):
        limited = _limited(record, t, fitted, command_limits, seed, period)
        elsewhere = {f.name: _sensitivity(f, t.settings, timing) for f in fits if f is not fitted}
        # A simpler model was beaten; a richer one was only not clearly better.
        richer = {f.name: elsewhere[f.name] for f in fits[selected + 1 :]}
        out.append(
            TuningReport(
                t.method,
                t.form,
                t.settings,
                t.margins,
                allowed.worst_case(t.settings) if allowed and t.margins.stable else None,
                t.predicted,
                realise(t.settings, fitted if i == proposal.recommended else None, add_half=t.margins, **timing),
                (*t.findings, *saturates(limited, record.speed_unit), *_elsewhere(richer, t, target)),
                limited,
                elsewhere,
            )
        )
    return tuple(out)


def _limited(
    record: LoopRecord, t: Tuning, fitted: Fit, limits: tuple[float | None, float | None], seed: int, period: float
) -> LimitedOutcome | None:
    plant = lagged(fitted)
    if plant is None or t.predicted is None:
        return None
    move = largest_move(record, plant.static_gain, limits)
    if move is None:
        return None
    noise = fitted.statistics.rms_residual
    return limited_outcome(plant, t.settings, t.predicted.setpoint_step, move, period=period, noise=noise, seed=seed)


def _sensitivity(other: Fit, settings: PidSettings, timing: dict[str, Any]) -> float | None:
    found = margins(other, settings, **timing)
    return max(found.Ms, found.Mt) if found.Ms is not None and found.Mt is not None else None


def _elsewhere(found: dict[str, float | None], t: Tuning, target: float) -> tuple[Finding, ...]:
    """A finding where settings that keep the target on the selected model do not on another that was accepted."""
    if t.margins.Ms is None or t.margins.Mt is None or max(t.margins.Ms, t.margins.Mt) > target + NOTABLE:
        return ()
    over = {name: value for name, value in found.items() if value is None or value > target + NOTABLE}
    if not over:
        return ()
    said = ", ".join(f"{name.upper()}: {'unstable' if v is None else f'{v:.2f}'}" for name, v in over.items())
    return (
        Finding(
            "target-missed-on-other-model",
            "warning",
            "On a richer model, which this log does not rule out, these settings exceed the robustness target of "
            f"{target:g} (max(Ms, Mt) {said}). Ask for a lower target, or log a test that tells the models apart.",
            dict(over),
        ),
    )
