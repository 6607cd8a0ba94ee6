"""Diagnostics: statistics of a fitted point, and the findings they give rise to."""

from __future__ import annotations

import math

import numpy as np
from scipy.signal import lfilter

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
    own = at.jacobian.shape[0]
    rows = np.empty((1 + own + len(lags), layout.rows))
    rows[0] = at.residual
    rows[1 : 1 + own] = at.jacobian
    for row, lag in zip(rows[1 + own :], lags, strict=True):
        _past_command(layout, int(lag), row)
    return left_in(_whiten(rows, colour), own)


def _past_command(layout: Layout, lag: int, into: Floats) -> None:
    """Write the command `lag` rows ago, at the used rows, into a row."""
    at = 0
    for s in layout.stretches:
        n = s.rows - s.skip
        early = min(max(lag - s.skip, 0), n)
        into[at : at + early] = s.command[0]
        into[at + early : at + n] = s.command[s.skip + early - lag : s.rows - lag] if early < n else 0.0
        at += n


def _whiten(rows: Floats, colour: Colour) -> Floats:
    if colour.white:
        return rows
    return np.asarray(lfilter(np.concatenate(([1.0], colour.a)), [1.0], rows, axis=1)[:, len(colour.a) :])
