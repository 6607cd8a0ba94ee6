"""Cross-check: the fitted model's step response beside those of models that presume no structure.

Two of them: a high-order ARX model by least squares, whose covariance says how far it may be off, and a subspace
model. Each is compared at the lags of its own stride, over the time that the fitted model takes to settle.
A difference is judged against the high-order model's std alone: where the fit is right, the variance of the
difference is that one less the fit's own (Hausman 1978, Econometrica 46, 1251-1271), so the bound is on the safe side.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ident.errors import NotIdentifiable
from ident.estimate import Fit
from ident.estimate.lagged import Runs, even_runs
from ident.findings import Finding, Severity
from ident.judge.high_order import high_order
from ident.judge.resonance import resonance
from ident.judge.steps import settling_step
from ident.judge.subspace import subspace_step
from ident.record import LoopRecord
from ident.record.segments import Floats

PAST_SPEEDS = 20
SWINGS = 40  # past speeds at the log's own rate: with fewer, noise makes a swing look well damped
REACH = 60  # strides within which the fitted model settles
FINEST = 20  # command lags at least
ROWS_PER_LAG = 8
ROWS_PER_PAST = 20  # a short log gets fewer past speeds, FEWEST_PAST at least
FEWEST_PAST = 4
SUBSPACE_ROWS = 20_000
CLEAR = 3.5  # standard deviations, the largest over the response
NOTABLE, LARGE = 5.0, 10.0  # percent of the settled gain


@dataclass(frozen=True, slots=True)
class CrossCheck:
    """One structure-free model beside the fitted one.

    method                  "high-order-arx" or "subspace"
    agreement_percent       100 less the rms difference of the step responses, in percent of the settled gain
    max_difference_percent  the largest difference;  at_s  where it lies, s after the step
    rms_difference_percent  the rms difference
    bound_percent           what chance alone may make of the largest difference; None: the method states none
    step_s                  stride between the compared instants, s;  settled_s  the time compared, s
    """

    method: str
    agreement_percent: float
    max_difference_percent: float
    at_s: float
    rms_difference_percent: float
    bound_percent: float | None
    step_s: float
    settled_s: float


@dataclass(frozen=True, slots=True)
class CrossChecks:
    """All cross-checks of one fit that worked, and what they gave rise to notice."""

    checks: tuple[CrossCheck, ...]
    findings: tuple[Finding, ...]


def cross_check(record: LoopRecord, fitted: Fit, *, subspace: bool = True) -> CrossChecks:
    """Compare a fit with models that presume no structure. Never raises for what a record holds.

    subspace  also ask sippy-unipi, which is slow to load

    Such models are linear: where dry friction was fitted, its share is taken off the speed first.
    """
    if fitted.friction_speed is not None:
        record = replace(record, speed=record.speed - fitted.friction_speed)
    try:
        runs = even_runs(record)
    except NotIdentifiable as error:
        return CrossChecks((), (_failed("both", f"they need one sample time ({error.code})", "info"),))
    most = max(max(r.rows for r in runs.runs) // 3, 2)
    step = settling_step(fitted.model, runs.step, most)
    strides = max(min(REACH, runs.rows() // (3 * ROWS_PER_LAG)), 1)
    stride = max(-(-len(step) // strides), 1)
    expected = step[::stride]
    checks: list[CrossCheck] = []
    findings: list[Finding] = []

    lags = max(len(expected) + 5, FINEST)
    past = min(max(runs.rows() // (ROWS_PER_PAST * stride), FEWEST_PAST), PAST_SPEEDS)
    wide = high_order(runs, past, lags, stride)
    if wide is None or float(np.abs(wide.poles).max()) >= 1.0:
        why = "the log has too few rows for it" if wide is None else "its model is unstable"
        findings.append(_failed("high-order-arx", why))
    else:
        found, std = wide.step_response(len(expected))
        checks.append(_compare("high-order-arx", found, expected, wide.step, std))
    findings += _resonance(runs, fitted)

    if subspace:
        dead = int(fitted.model.dead_time / (runs.step * stride))
        longest = max(runs.runs, key=lambda r: r.rows)
        command = _means(longest.command, stride)
        rows = _liveliest(command, SUBSPACE_ROWS)
        seen, why = subspace_step(command[rows], longest.speed[::stride][rows], dead, len(expected))
        if seen is None:
            findings.append(_failed("subspace", why))
        else:
            checks.append(_compare("subspace", seen, expected, runs.step * stride, None))
    findings += [f for f in map(_disagreement, checks) if f]
    return CrossChecks(tuple(checks), tuple(findings))


def _compare(method: str, found: Floats, expected: Floats, step: float, std: Floats | None) -> CrossCheck:
    gain = float(np.abs(expected).max())
    difference = 100.0 * np.abs(found - expected) / gain
    largest = int(np.argmax(difference))
    rms = float(np.sqrt(np.mean(difference**2)))
    return CrossCheck(
        method=method,
        agreement_percent=100.0 - rms,
        max_difference_percent=float(difference[largest]),
        at_s=largest * step,
        rms_difference_percent=rms,
        bound_percent=None if std is None else CLEAR * 100.0 * float(std[largest]) / gain,
        step_s=step,
        settled_s=(len(expected) - 1) * step,
    )


def _disagreement(check: CrossCheck) -> Finding | None:
    if check.max_difference_percent <= max(NOTABLE, check.bound_percent or 0.0):
        return None
    return Finding(
        "models-disagree",
        "warning" if check.max_difference_percent > LARGE else "info",
        f"A model that presumes no structure ({check.method}) answers a step differently by up to "
        f"{check.max_difference_percent:.0f} % of the settled gain, {check.at_s:.3g} s after it: the fitted model "
        "leaves some of the dynamics out, or a disturbance bends one of the two.",
        {
            "method": check.method,
            "max_difference_percent": check.max_difference_percent,
            "at_s": check.at_s,
            "bound_percent": check.bound_percent,
        },
    )


def _resonance(runs: Runs, fitted: Fit) -> list[Finding]:
    # Strides hide what swings faster than they do: here the log's own rate counts.
    own = high_order(runs, SWINGS, REACH)
    found = resonance(own, fitted.model) if own is not None else None
    return [found] if found else []


def _failed(method: str, why: str, severity: Severity = "warning") -> Finding:
    return Finding(
        "crosscheck-failed",
        severity,
        f"The structure-free cross-check ({method}) gave no answer: {why}. The fit stands on its own statistics.",
        {"method": method, "reason": why},
    )


def _liveliest(command: Floats, most: int) -> slice:
    """The span of `most` rows in which the command moves most: a wider stride instead would hide the response."""
    if len(command) <= most:
        return slice(0, len(command))
    total = np.cumsum(np.concatenate(([0.0], np.abs(np.diff(command)))))
    start = int(np.argmax(total[most - 1 :] - total[: len(total) - most + 1]))
    return slice(start, start + most)


def _means(values: Floats, stride: int) -> Floats:
    """Means of `stride` rows from every stride-th row on; the last one whole."""
    whole = len(values) // stride
    return np.asarray(values[: whole * stride].reshape(whole, stride).mean(axis=1))
