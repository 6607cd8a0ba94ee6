"""Refine: Gauss-Newton in the shape's logarithms and L on the full record, gain, offset and transients eliminated.

Under a held command a first-order answer starts with a corner, so its sum of squares is smooth in L only within one
sample interval (a cell): the descent stays inside one cell at a time and crosses into the next only where that goes on
descending. A straight command, or a second lag, has no corners and no cells.
(Kaufman 1975, BIT 15, 49-57: the eliminated parameters' correction is solved with the step.)
"""

from __future__ import annotations

import numpy as np

from ident.estimate.first_order import FirstOrder
from ident.estimate.layout import Layout
from ident.estimate.point import Point, point
from ident.estimate.shape import Shape
from ident.evidence.normal import solve_normal
from ident.record.segments import Floats

MOST_STEPS = 40
MOST_HALVINGS = 8
# The descent ends when the next step promises less than this share of one residual's variance:
# a thousandth of a standard deviation of the parameters.
PROMISE = 1e-6
EXACT = 1e-26  # of the speed's sum of squares: nothing left to explain


def refine(layout: Layout, shape: Shape, L: float, promise: float = PROMISE) -> Point:
    """The nearest minimum from (shape, L), through as many cells of the dead time as it takes."""
    h = layout.step
    L = max(L, 0.0)
    if not (layout.uniform and isinstance(shape, FirstOrder)) or layout.straight:
        return _descend(layout, point(layout, shape, L), 0.0, np.inf, promise)
    cell = int(L / h)
    best = _descend(layout, point(layout, shape, L), cell * h, (cell + 1) * h, promise)
    for _ in range(MOST_STEPS):
        if best.L >= (cell + 1) * h:
            step = 1
        elif best.L <= cell * h and cell > 0:
            step = -1
        else:
            break
        start = point(layout, best.shape, best.L, side=step)
        other = _descend(layout, start, (cell + step) * h, (cell + step + 1) * h, promise)
        if not other.rss < best.rss * (1.0 - 1e-12):
            break
        best, cell = other, cell + step
    return best


def _descend(layout: Layout, at: Point, low: float, high: float, promise: float) -> Point:
    total = float(layout.target @ layout.target)
    k = at.log_count
    for _ in range(MOST_STEPS):
        if at.rss <= EXACT * total:
            break
        step = _bounded_step(at, *at.shape.reach(layout), low - at.L, high - at.L)
        promised = float(2.0 * step @ at.toward - step @ at.gram @ step)
        if promised <= promise * at.rss / layout.rows:
            break
        ahead = None
        for halving in range(MOST_HALVINGS):
            share = 0.5**halving
            L = float(np.clip(at.L + share * step[1 + k], low, high))
            shape = at.shape.moved(share * step[1 : 1 + k], layout)
            if shape == at.shape and L == at.L:
                break
            trial = point(layout, shape, L)
            if trial.rss < at.rss:
                ahead = trial
                break
        if ahead is None:
            break
        at = ahead
    return at


def _bounded_step(at: Point, least: Floats, most: Floats, back: float, ahead: float) -> Floats:
    """The Gauss-Newton step within bounds of the shape's logarithms (k,) and of L; what meets its bound is held there
    and the others are solved for again."""
    k, all_of = at.log_count, np.arange(len(at.gram))
    lows, highs = np.full(len(all_of), -np.inf), np.full(len(all_of), np.inf)
    lows[1 : 2 + k], highs[1 : 2 + k] = [*least, back], [*most, ahead]
    step = solve_normal(at.gram, at.toward)
    held = np.zeros(len(all_of), dtype=np.bool_)
    while True:
        beyond = ~held & ((step < lows) | (step > highs))
        if not beyond.any():
            return step
        held |= beyond
        step = np.where(held, np.clip(step, lows, highs), 0.0)
        free = all_of[~held]
        toward = at.toward[free] - at.gram[np.ix_(free, all_of[held])] @ step[held]
        step[free] = solve_normal(at.gram[np.ix_(free, free)], toward)
