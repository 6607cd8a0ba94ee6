"""Worth: how well an ARX model describes the log, in the figures every fit reports."""

from __future__ import annotations

import math

import numpy as np

from ident.errors import NotIdentifiable
from ident.estimate.equation import Equation, fit_equation
from ident.estimate.lagged import Runs
from ident.evidence.criteria import aicc, bic, fit_percent
from ident.evidence.residuals import autocorrelation, left_in, ljung_box
from ident.evidence.statistics import Statistics
from ident.record.segments import Floats

LAGS = 40  # for the largest autocorrelation
TESTED_LAGS = 20  # for the Ljung-Box test
COMMAND_LAGS = 8  # past commands tried against the equation errors
TRAINED = 0.7  # share of the rows that the held-out test is fitted on
MOVES = 0.2  # of the command's whole span: what each part must move


def statistics(runs: Runs, fitted: Equation, simulated: list[Floats], searched: bool) -> Statistics:
    """Fit and rms are of the simulated response; criteria and tests of the one-step errors, assumed white.

    simulated  per run, as `Equation.simulate` gives it;  searched  the delay counts as a fitted number
    """
    errors = [fitted.errors(r) for r in runs.runs if r.rows > fitted.skip]
    e, n = np.concatenate(errors), fitted.rows
    p = len(fitted.coefficients) + 1 + searched
    measured = np.concatenate([r.speed[fitted.skip :] for r in runs.runs])
    modelled = np.concatenate([s[fitted.skip :] for s in simulated])
    r = autocorrelation(e, min(LAGS, n // 4))
    tested = r[: min(TESTED_LAGS, n // 5)]
    largest = int(np.argmax(np.abs(r))) if len(r) and not fitted.exact else None
    return Statistics(
        fit_percent=fit_percent(measured, modelled),
        rms_residual=math.sqrt(float(np.mean((measured - modelled) ** 2))),
        aicc=None if fitted.exact else aicc(fitted.rss, n, p),
        bic=None if fitted.exact else bic(fitted.rss, n, p),
        whiteness_p=None if fitted.exact or not len(tested) else ljung_box(tested, n, len(fitted.model.a))[1],
        max_autocorrelation=None if largest is None else float(r[largest]),
        max_autocorrelation_lag=None if largest is None else largest + 1,
        input_correlation_p=None if fitted.exact else _input_correlation(runs, fitted),
        validation_fit_percent=_validation(runs, fitted),
        rows_used=n,
    )


def _input_correlation(runs: Runs, fitted: Equation) -> float | None:
    """p that past commands outside the equation explain nothing of its errors."""
    model = fitted.model
    inside = range(model.delay, model.delay + len(model.b))
    reach = min(2 * inside[-1] + COMMAND_LAGS, max(r.rows for r in runs.runs) // 4)
    outside = np.array([lag for lag in range(1, reach + 1) if lag not in inside])
    if not len(outside):
        return None
    lags = outside[np.unique(np.linspace(0, len(outside) - 1, COMMAND_LAGS).astype(int))]
    skip = max(fitted.skip, int(lags[-1]))
    parts = []
    for run in runs.runs:
        if run.rows <= skip:
            continue
        own = [run.speed[skip - i : run.rows - i] for i in range(1, len(model.a) + 1)]
        commands = [run.command[skip - lag : run.rows - lag] for lag in (*inside, *lags)]
        parts.append(np.stack((fitted.errors(run)[skip - fitted.skip :], np.ones(run.rows - skip), *own, *commands)))
    rows = np.concatenate(parts, axis=1) if len(parts) > 1 else parts[0]
    return left_in(rows, 1 + len(fitted.coefficients))


def _validation(runs: Runs, fitted: Equation) -> float | None:
    """NRMSE fit, %, over the last rows, simulated by the same orders fitted to the first.

    None where one of the two parts does not move enough to say anything.
    """
    command = np.concatenate([r.command for r in runs.runs])
    row = int(TRAINED * len(command))
    if min(float(np.ptp(command[:row])), float(np.ptp(command[row:]))) < MOVES * float(np.ptp(command)):
        return None
    try:
        trained = fit_equation(runs.first(row), len(fitted.model.a), len(fitted.model.b), fitted.model.delay)
    except NotIdentifiable:
        return None
    if not trained.model.stable:
        return None
    measured, modelled, before = [], [], 0
    for run in runs.runs:
        # A run that begins among the held-out rows has an initial state of its own, taken from itself.
        cut = max(row - before, 0)
        if cut < run.rows:
            start = max(cut, trained.skip)
            known = cut if cut > 2 * trained.skip else None
            measured.append(run.speed[start:])
            modelled.append(trained.simulate(run, known)[start:])
        before += run.rows
    y, y_model = np.concatenate(measured), np.concatenate(modelled)
    return fit_percent(y, y_model) if len(y) else None
