"""Uncertainty: covariance of a fitted point, intervals, the dead time's profile.

The slopes are taken in log|K/T|, log T and L. Where a record is short against T only the ratio K/T is known, and in
these coordinates that is one good and one poor direction instead of a singular matrix.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ident.estimate.cells import Cells
from ident.estimate.coloured import noise_slopes
from ident.estimate.fit import DeadTimeProfile
from ident.estimate.layout import Layout
from ident.estimate.point import Point
from ident.estimate.search import around
from ident.estimate.slow_drift import without_drift
from ident.evidence.colour import Colour, coloured_covariance, inverse_gram
from ident.evidence.estimates import NORMAL_95, Covariance, Estimate
from ident.record.segments import Floats

CHI2_95 = NORMAL_95**2
OPEN = 1.0  # std of a logarithm beyond which the log leaves that side of an interval open
PROFILE_CELLS = 24  # most cells on either side of the minimum
PROFILE_POINTS = 121


@dataclass(frozen=True, slots=True, eq=False)
class Uncertainty:
    """Of a point with k time constants.

    log_covariance   (k + 2, k + 2) of log|K|, the shape's logarithms and L (s)
    inflation        variance of L over the one that the residuals' sum of squares alone would give
    """

    log_covariance: Floats
    inflation: float

    def std_log_ratio(self) -> float:
        """Std of log|K/T|, T the first of the shape's times."""
        c = self.log_covariance
        return math.sqrt(max(c[0, 0] + c[1, 1] - 2.0 * c[0, 1], 0.0))


def uncertainty(layout: Layout, at: Point, colour: Colour) -> Uncertainty:
    """First-order covariance at a least-squares point.

    Whitened residuals: plant and noise terms are known together, as under feedback they are correlated. Plain ones:
    `colour` is theirs, and widens the covariance.
    """
    k = at.log_count
    rows = at.jacobian.shape[1]
    to_logs = np.eye(len(at.gram))  # of the model's own parameters, K first, the shape's logarithms next
    to_logs[0, 0] = at.K  # log|K/T| at fixed T
    to_logs[1, 0] = at.K  # log T at fixed K/T
    variance = at.rss / rows
    white = variance * inverse_gram(to_logs @ at.gram @ to_logs.T)[: k + 2, : k + 2]
    known = len(at.gram)
    if not layout.colour.white:
        slopes = np.vstack((to_logs @ at.jacobian, noise_slopes(layout, at)))
        true, known = variance * inverse_gram(slopes @ slopes.T)[: k + 2, : k + 2], len(slopes)
    elif colour.white:
        true = white
    else:
        true = coloured_covariance(to_logs @ at.jacobian, colour)[: k + 2, : k + 2]
    true = true * _spectrum_unknown(rows, colour.order) * rows / max(rows - known, 1)
    if layout.on_change:
        # A report tells the speed no better than a reading rounded to the deadband would, and the dead time no finer
        # than the gaps. Reports that were picked by their noise alternate about the model: nothing is gained by that.
        least = white * max(1.0, layout.deadband**2 / 12.0 / variance)
        true = true * max(1.0, float((np.diag(least) / np.diag(true)).max()))
        true[-1, -1] = max(true[-1, -1], layout.step**2 / 12.0)
    back = np.eye(k + 2)
    back[0, 1] = 1.0  # log|K| = log|K/T| + log T
    inflation = float(true[-1, -1] / white[-1, -1]) if white[-1, -1] > 0 else 1.0
    return Uncertainty(back @ true @ back.T, inflation)


def _spectrum_unknown(rows: int, order: int) -> float:
    """What the noise's own spectrum, estimated with so many terms, adds to a variance: that of a t-distribution.

    At low frequency its logarithm has the variance 4 order/rows (Berk 1974, Annals of Statistics 2, 489-502; from
    memory), as that of a chi-squared with rows/(2 order) degrees of freedom: ten or more, as noise models are bounded.
    """
    if order == 0:
        return 1.0
    degrees = rows / (2.0 * order)
    return degrees / (degrees - 2.0)


def log_estimate(value: float, std_log: float, unit: str) -> Estimate:
    """An Estimate whose logarithm is normal; an interval side the log does not bound is None."""
    size = abs(value)
    low = size * math.exp(-NORMAL_95 * std_log) if std_log <= OPEN else None
    high = size * math.exp(NORMAL_95 * std_log) if std_log <= OPEN else None
    ci = (low, high)
    if value < 0:
        ci = (None if high is None else -high, None if low is None else -low)
    return Estimate(value, size * std_log if std_log <= OPEN else None, ci, unit)


def dead_time_profile(
    layout: Layout, at: Point, known: Uncertainty, window: Cells | None = None
) -> DeadTimeProfile | None:
    """The profile over the cells around the minimum, `window` where it is wide enough.

    None where rows are off one grid, fit exactly, or dry friction turns with the speed.
    """
    std = math.sqrt(known.log_covariance[-1, -1])
    if (
        not layout.uniform
        or layout.straight
        or layout.rubbing
        or at.rss <= 1e-20 * float(layout.target @ layout.target)
        or std == 0.0
    ):
        return None
    h = layout.step
    reach = max(1, min(math.ceil(4.5 * std / h), PROFILE_CELLS))
    cell = int(at.L / h)
    if window is None or window.first > max(cell - reach, 0) or cell + reach >= window.first + len(window.gram):
        window = around(without_drift(layout, at), at.shape.lags, at.L, reach)
    low = max(at.L - 4.5 * std, window.first * h)
    high = min(at.L + 4.5 * std, (window.first + len(window.gram)) * h)
    L = np.unique(np.concatenate((np.linspace(low, high, PROFILE_POINTS), [at.L])))
    rss, _ = window.profile(L)
    ratio = np.maximum(rss / float(rss.min()), 1.0)
    return DeadTimeProfile(L, ratio, math.exp(CHI2_95 * known.inflation / layout.rows))


def dead_time_estimate(L: float, std: float, profile: DeadTimeProfile | None) -> Estimate:
    """The dead time with its interval from the profile; beyond the profile's ends the normal one, never below 0."""
    low, high = max(L - NORMAL_95 * std, 0.0), L + NORMAL_95 * std
    if profile is not None:
        allowed = np.flatnonzero(profile.ratio <= profile.limit)
        if len(allowed):
            if allowed[0] > 0:
                low = _crossing(profile, int(allowed[0]), -1)
            elif profile.L[0] <= 0.0:
                low = 0.0
            if allowed[-1] < len(profile.L) - 1:
                high = _crossing(profile, int(allowed[-1]), 1)
    return Estimate(L, std, (min(low, L), max(high, L)), "s")


def _crossing(profile: DeadTimeProfile, inside: int, step: int) -> float:
    """Where the profile crosses its limit between an allowed point and its neighbour."""
    a, b = profile.ratio[inside], profile.ratio[inside + step]
    share = (profile.limit - a) / (b - a) if b > a else 0.0
    return float(profile.L[inside] + share * (profile.L[inside + step] - profile.L[inside]))


def covariance_of(names: tuple[str, ...], slopes: Floats, known: Uncertainty) -> Covariance:
    """Covariance of named parameters to first order, `slopes` (names, k + 2) theirs in the logarithms and L."""
    matrix = slopes @ known.log_covariance @ slopes.T
    return Covariance(names, tuple(tuple(float(v) for v in row) for row in matrix))
