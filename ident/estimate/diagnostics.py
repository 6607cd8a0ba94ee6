"""Diagnostics: statistics of a fitted point, and the findings they give rise to."""

from __future__ import annotations

import math

import numpy as np

from ident.estimate.layout import Layout
from ident.estimate.point import Point
from ident.evidence.colour import Colour
from ident.evidence.criteria import aicc, bic, fit_percent
from ident.evidence.residuals import autocorrelation, left_in, ljung_box
from ident.evidence.statistics import Statistics
from ident.record.segments import Floats

LAGS = 40  # for the largest autocorrelation
TESTED_LAGS = 20  # for the Ljung-Box test
COMMAND_LAGS = 8  # past commands tried against the residual


def statistics(layout: Layout, at: Point, colour: Colour, validation: float | None) -> Statistics:
    """Statistics at the used rows, `colour` the noise's; tests that need more rows than there are give None.

    Fit and rms are of the simulated response; criteria and tests of what the noise model leaves unexplained.
    """
    n, p = layout.rows, at.jacobian.shape[0] + colour.order
    white = layout.whitened(colour)
    left = white.whiten(at.raw)
    power = float(at.raw @ at.raw)
    exact = power <= 1e-20 * float(layout.speed @ layout.speed)
    r = autocorrelation(left, min(LAGS, n // 4))
    tested = r[: min(TESTED_LAGS, n // 5)]
    largest = int(np.argmax(np.abs(r))) if len(r) else None
    # A fit without residuals has no likelihood to speak of.
    rss = float(left @ left)
    return Statistics(
        fit_percent=fit_percent(layout.speed, layout.speed - at.raw),
        rms_residual=math.sqrt(power / n),
        aicc=None if exact else aicc(rss, n, p),
        bic=None if exact else bic(rss, n, p),
        whiteness_p=None if exact or len(tested) == 0 else ljung_box(tested, n, colour.order)[1],
        max_autocorrelation=None if exact or largest is None else float(r[largest]),
        max_autocorrelation_lag=None if exact or largest is None else largest + 1,
        input_correlation_p=None if exact else _input_correlation(layout, white, at, left),
        validation_fit_percent=validation,
        rows_used=n,
        noise_order=colour.order,
    )


def _input_correlation(layout: Layout, white: Layout, at: Point, left: Floats) -> float:
    """p that past commands explain nothing of the whitened residual beyond the model."""
    reach = max(int((at.L + 3.0 * at.shape.lags) / layout.step), COMMAND_LAGS)
    longest = max(s.rows for s in layout.stretches)
    lags = np.unique(np.linspace(1, min(reach, longest // 2), COMMAND_LAGS).astype(int))
    own = at.jacobian.shape[0]
    rows = np.empty((1 + own + len(lags), layout.rows))
    rows[0] = left
    rows[1 : 1 + own] = at.jacobian if not layout.colour.white else white.whiten(at.jacobian)
    for row, lag in zip(rows[1 + own :], lags, strict=True):
        _past_command(layout, int(lag), row)
    rows[1 + own :] = white.whiten(rows[1 + own :])
    return left_in(rows, own)


def _past_command(layout: Layout, lag: int, into: Floats) -> None:
    """Write the command `lag` rows ago, at the used rows, into a row."""
    at = 0
    for s in layout.stretches:
        n = s.rows - s.skip
        early = min(max(lag - s.skip, 0), n)
        into[at : at + early] = s.command[0]
        into[at + early : at + n] = s.command[s.skip + early - lag : s.rows - lag] if early < n else 0.0
        at += n
