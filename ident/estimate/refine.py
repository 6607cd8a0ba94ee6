"""Refine: Gauss-Newton in (log T, L) on the full record, gain, offset and transients eliminated.

Within a cell of the dead time the sum of squares is smooth, so the descent stays inside one cell at a time and
crosses into the next only where that goes on descending.
(Kaufman 1975, BIT 15, 49-57: the eliminated parameters' correction is solved with the step.)
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.estimate.columns import Columns, columns
from ident.estimate.layout import Layout
from ident.evidence.normal import solve_normal
from ident.record.segments import Floats

MOST_STEPS = 40
MOST_HALVINGS = 8
# The descent ends when the next step promises less than this share of one residual's variance:
# a thousandth of a standard deviation of the parameters.
PROMISE = 1e-6
NEARLY_EXACT = 1e-10
EXACT = 1e-26  # of the speed's sum of squares: nothing left to explain
LONGEST_T = 100.0  # durations of the record; beyond it the plant integrates as far as the log can tell
SHORTEST_T = 0.02  # steps


@dataclass(frozen=True, slots=True, eq=False)
class Point:
    """A FOPDT at (T, L) with its best linear part.

    K, nuisance   gain; offset and transient amplitudes
    residual      (rows,), speed less the model;  rss  its sum of squares
    jacobian      (3 + nuisance, rows): slopes of the model in K, log T, L, then the nuisance parameters
    """

    T: float
    L: float
    K: float
    nuisance: Floats
    residual: Floats
    rss: float
    jacobian: Floats


def point(layout: Layout, T: float, L: float, side: int = 1) -> Point:
    """The best FOPDT at a given (T, L); `side` -1 takes the slope below a kink."""
    at = columns(layout, T, L)
    if side < 0:
        # One part in 10^9 of a step below: inside the lower cell, where the slope is the other one.
        at = _with_slope_below(at, columns(layout, T, L - 1e-9 * layout.step))
    linear = np.vstack((at.response, at.nuisance))
    solution = _solve(linear, layout.speed)
    residual = layout.speed - solution @ linear
    if float(residual @ residual) < NEARLY_EXACT * float(layout.speed @ layout.speed):
        # Normal equations lose half the digits; without noise they are wanted back.
        solution = solution + _solve(linear, residual)
        residual = layout.speed - solution @ linear
    K, nuisance = float(solution[0]), solution[1:]
    slope_T = K * at.slope_T + nuisance @ at.nuisance_slope_T
    jacobian = np.vstack((at.response, T * slope_T, K * at.slope_L, at.nuisance))
    return Point(T, L, K, nuisance, residual, float(residual @ residual), jacobian)


def refine(layout: Layout, T: float, L: float, promise: float = PROMISE) -> Point:
    """The nearest minimum from (T, L), through as many cells of the dead time as it takes."""
    h = layout.step
    if not layout.uniform:
        return _descend(layout, point(layout, T, max(L, 0.0)), 0.0, np.inf, promise)
    cell = int(max(L, 0.0) / h)
    best = _descend(layout, point(layout, T, max(L, 0.0)), cell * h, (cell + 1) * h, promise)
    for _ in range(MOST_STEPS):
        if best.L >= (cell + 1) * h:
            step = 1
        elif best.L <= cell * h and cell > 0:
            step = -1
        else:
            break
        start = point(layout, best.T, best.L, side=step)
        other = _descend(layout, start, (cell + step) * h, (cell + step + 1) * h, promise)
        if not other.rss < best.rss * (1.0 - 1e-12):
            break
        best, cell = other, cell + step
    return best


def _descend(layout: Layout, at: Point, low: float, high: float, promise: float) -> Point:
    total = float(layout.speed @ layout.speed)
    shortest, longest = SHORTEST_T * layout.step, LONGEST_T * layout.duration
    for _ in range(MOST_STEPS):
        if at.rss <= EXACT * total:
            break
        step = _solve(at.jacobian, at.residual)
        if (at.L >= high and step[2] > 0) or (at.L <= low and step[2] < 0):
            # The dead time is held at the end of its cell; T alone moves.
            free = np.delete(at.jacobian, 2, axis=0)
            short = _solve(free, at.residual)
            step = np.insert(short, 2, 0.0)
        promised = float(at.residual @ (step @ at.jacobian))
        if promised <= promise * at.rss / layout.rows:
            break
        ahead = None
        for halving in range(MOST_HALVINGS):
            share = 0.5**halving
            T = float(np.clip(at.T * np.exp(np.clip(share * step[1], -1.5, 1.5)), shortest, longest))
            L = float(np.clip(at.L + share * step[2], low, high))
            trial = point(layout, T, L)
            if trial.rss < at.rss:
                ahead = trial
                break
        if ahead is None:
            break
        at = ahead
    return at


def _solve(rows: Floats, right: Floats) -> Floats:
    """Least squares of `right` (n,) on the rows (k, n)."""
    return solve_normal(rows @ rows.T, rows @ right)


def _with_slope_below(at: Columns, below: Columns) -> Columns:
    return Columns(at.response, below.slope_T, below.slope_L, at.nuisance, at.nuisance_slope_T)
