"""Diagnostics: statistics of a fitted point, and the findings they give rise to."""

from __future__ import annotations

import math

import numpy as np

from ident.estimate.layout import Layout
from ident.estimate.refine import Point
from ident.evidence.colour import Colour
from ident.evidence.criteria import aicc, bic, fit_percent
from ident.evidence.residuals import autocorrelation, left_in, ljung_box
from ident.evidence.statistics import Statistics
from ident.record.segments import Floats

LAGS = 40  # for the largest autocorrelation
TESTED_LAGS = 20  # for the Ljung-Box test
COMMAND_LAGS = 8  # past commands tried against the residual


def statistics(layout: Layout, at: Point, colour: Colour, validation: float | None) -> Statistics:
    """Statistics of the residuals at the used rows; tests that need more rows than there are give None."""
    n, p = layout.rows, at.jacobian.shape[0]
    exact = at.rss <= 1e-20 * float(layout.speed @ layout.speed)
    r = autocorrelation(at.residual, min(LAGS, n // 4))
    tested = r[: min(TESTED_LAGS, n // 5)]
    largest = int(np.argmax(np.abs(r))) if len(r) else None
    return Statistics(
        fit_percent=fit_percent(layout.speed, layout.speed - at.residual),
        rms_residual=math.sqrt(at.rss / n),
        # A fit without residuals has no likelihood to speak of.
        aicc=None if exact else aicc(at.rss, n, p),
        bic=None if exact else bic(at.rss, n, p),
        whiteness_p=None if exact or len(tested) == 0 else ljung_box(tested, n)[1],
        max_autocorrelation=None if exact or largest is None else float(r[largest]),
        max_autocorrelation_lag=None if exact or largest is None else largest + 1,
        input_correlation_p=None if exact else input_correlation(layout, at, colour),
        validation_fit_percent=validation,
        rows_used=n,
    )


def input_correlation(layout: Layout, at: Point, colour: Colour) -> float:
    """p that past commands explain nothing of the residual beyond the model, residuals whitened first."""
    reach = max(int((at.L + 3.0 * at.T) / layout.step), COMMAND_LAGS)
    longest = max(s.rows for s in layout.stretches)
    lags = np.unique(np.linspace(1, min(reach, longest // 2), COMMAND_LAGS).astype(int))
    past = np.stack([_past_command(layout, int(lag)) for lag in lags])
    whitened = _whiten(np.vstack((at.residual, at.jacobian, past)), colour)
    k = at.jacobian.shape[0]
    return left_in(whitened[0], whitened[1 : 1 + k], whitened[1 + k :])


def _past_command(layout: Layout, lag: int) -> Floats:
    parts = []
    for s in layout.stretches:
        shifted = np.concatenate((np.full(min(lag, s.rows), s.command[0]), s.command[: max(s.rows - lag, 0)]))
        parts.append(shifted[s.skip :])
    return np.concatenate(parts) if len(parts) > 1 else parts[0]


def _whiten(rows: Floats, colour: Colour) -> Floats:
    if colour.white:
        return rows
    order = len(colour.a)
    n = rows.shape[1]
    white = rows[:, order:].copy()
    for k, a in enumerate(colour.a, start=1):
        white += a * rows[:, order - k : n - k]
    return white
