"""Zoom: many maxima or roots refined at once by narrowing their brackets on a shrinking grid."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
# One round narrows a bracket 8-fold (a maximum) or 16-fold (a root).
POINTS = 17
ROUNDS = 5


def _grid(lo: Floats, hi: Floats) -> Floats:
    return lo[:, None] + (hi - lo)[:, None] * np.linspace(0.0, 1.0, POINTS)


def maxima(f: Callable[[Floats], Floats], lo: Floats, hi: Floats) -> tuple[Floats, Floats]:
    """Where f peaks in each bracket, and how high.

    f        elementwise on arrays of any shape;  lo, hi  (n,) brackets, each around one maximum
    returns  (n,) places, (n,) values. The value is exact to rounding: its error is quadratic in the bracket.
    """
    rows = np.arange(len(lo))
    x, value = lo, np.full(len(lo), -np.inf)
    for _ in range(ROUNDS):
        grid = _grid(lo, hi)
        values = f(grid)
        top = np.argmax(values, axis=1)
        x, value = grid[rows, top], values[rows, top]
        lo, hi = grid[rows, np.maximum(top - 1, 0)], grid[rows, np.minimum(top + 1, POINTS - 1)]
    return x, value


def roots(f: Callable[[Floats], Floats], lo: Floats, hi: Floats) -> Floats:
    """The sign change of f in each bracket (n,), to about 1e-12 of the bracket where f is smooth."""
    rows = np.arange(len(lo))
    for _ in range(ROUNDS):
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
