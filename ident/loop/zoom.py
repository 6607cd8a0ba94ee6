"""Zoom: many maxima or roots refined at once by narrowing their brackets on a shrinking grid."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
# One round narrows a bracket 8-fold (a maximum) or 16-fold (a root); interpolation does the rest.
POINTS = 17
SHARES = np.linspace(0.0, 1.0, POINTS)
ROUNDS_TO_A_MAXIMUM, ROUNDS_TO_A_ROOT = 3, 4


def _grid(lo: Floats, hi: Floats) -> Floats:
    return lo[:, None] + (hi - lo)[:, None] * SHARES


def maxima(f: Callable[[Floats], Floats], lo: Floats, hi: Floats) -> tuple[Floats, Floats]:
    """Where f peaks in each bracket, and how high.

    f        elementwise on arrays of any shape;  lo, hi  (n,) brackets, each around one maximum
    returns  (n,) places, (n,) values. The value is exact to rounding: its error is of fourth order in the last grid.
    """
    rows = np.arange(len(lo))
    for _ in range(ROUNDS_TO_A_MAXIMUM):
        grid = _grid(lo, hi)
        values = f(grid)
        top = np.argmax(values, axis=1)
        before, after = np.maximum(top - 1, 0), np.minimum(top + 1, POINTS - 1)
        lo, hi = grid[rows, before], grid[rows, after]
    # The parabola through the highest point and its neighbours; a bracket that rises to its end keeps that.
    value = values[rows, top]
    fall, rise = value - values[rows, after], value - values[rows, before]
    both = fall + rise
    inside = (before < top) & (top < after) & (both > 0.0)
    share = np.divide(rise - fall, 2.0 * both, out=np.zeros_like(both), where=inside)
    return grid[rows, top] + share * (hi - lo) / 2.0, value + share * (rise - fall) / 4.0


def roots(f: Callable[[Floats], Floats], lo: Floats, hi: Floats) -> Floats:
    """The sign change of f in each bracket (n,), to about 1e-12 of the bracket where f is smooth."""
    rows = np.arange(len(lo))
    for _ in range(ROUNDS_TO_A_ROOT):
        grid = _grid(lo, hi)
        positive = f(grid) > 0
        # First cell whose ends differ; a bracket without one keeps its last cell.
        cell = np.argmax(positive[:, 1:] != positive[:, :1], axis=1)
        lo, hi = grid[rows, cell], grid[rows, cell + 1]
    at_lo, at_hi = f(lo), f(hi)
    rise = at_hi - at_lo
    share = np.divide(-at_lo, rise, out=np.full_like(lo, 0.5), where=rise != 0)
    result: Floats = lo + np.clip(share, 0.0, 1.0) * (hi - lo)
    return result
