"""Point: a shape and dead time with their best gain, offset and transients, and the slopes of the whole model."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.estimate.columns import columns
from ident.estimate.layout import Layout
from ident.estimate.shape import Shape
from ident.evidence.normal import gram_of, solve_normal
from ident.record.segments import Floats

NEARLY_EXACT = 1e-10  # of the speed's sum of squares


@dataclass(frozen=True, slots=True, eq=False)
class Point:
    """A model at (shape, L) with its best linear part, k the number of the shape's time constants.

    K, nuisance   gain; offset and transient amplitudes
    raw           (rows,), speed less the model
    residual      (rows,), the same whitened;  rss  its sum of squares
    jacobian      (2 + k + nuisance, rows), whitened: slopes of the model in K, the shape's logarithms, L, and the
                  nuisance parameters
    gram, toward  products of the jacobian's rows with themselves and with the residual
    """

    shape: Shape
    L: float
    K: float
    nuisance: Floats
    raw: Floats
    residual: Floats
    rss: float
    jacobian: Floats
    gram: Floats
    toward: Floats

    @property
    def log_count(self) -> int:
        """k."""
        return len(self.jacobian) - 2 - len(self.nuisance)


def point(layout: Layout, shape: Shape, L: float, side: int = 1) -> Point:
    """The best model at a given shape and L; `side` -1 takes the slope in L below a kink."""
    at = columns(layout, shape, L)
    k, rows = len(at.slopes), layout.rows
    jacobian = np.empty((2 + k + len(at.nuisance), rows))
    jacobian[0], jacobian[1 : 1 + k], jacobian[2 + k :] = at.response, at.slopes, at.nuisance
    jacobian[1 + k] = at.slope_L if side > 0 else _slope_below(layout, shape, L)
    linear = np.array([0, *range(2 + k, len(jacobian))])
    plain = jacobian if layout.colour.white else jacobian[linear]
    if not layout.colour.white:
        jacobian[linear] = layout.whiten(plain)
    solution, residual = _linear_part(jacobian, linear, layout.target)
    K, nuisance = float(solution[0]), solution[1:]
    moving = jacobian[1 : 2 + k]
    moving *= K
    at.add_transients(nuisance, moving[:k])
    raw = residual
    if not layout.colour.white:
        moving[:] = layout.whiten(moving)
        raw = layout.speed - solution @ plain
    return Point(
        shape,
        L,
        K,
        nuisance,
        raw,
        residual,
        float(residual @ residual),
        jacobian,
        gram_of(jacobian),
        jacobian @ residual,
    )


def _linear_part(jacobian: Floats, linear: NDArray[np.int64], target: Floats) -> tuple[Floats, Floats]:
    """Least squares of the target on the jacobian's rows `linear`, and what it leaves."""
    # Products of all rows, and zeros for the others: quicker than a copy of the few.
    gram = gram_of(jacobian)[np.ix_(linear, linear)]
    solution = np.zeros(len(jacobian))
    solution[linear] = solve_normal(gram, (jacobian @ target)[linear])
    residual = target - solution @ jacobian
    if float(residual @ residual) < NEARLY_EXACT * float(target @ target):
        # Normal equations lose half the digits; without noise they are wanted back.
        solution[linear] += solve_normal(gram, (jacobian @ residual)[linear])
        residual = target - solution @ jacobian
    return solution[linear], residual


def solve(rows: Floats, right: Floats) -> Floats:
    """Least squares of `right` (n,) on the rows (k, n)."""
    return solve_normal(gram_of(rows), rows @ right)


def _slope_below(layout: Layout, shape: Shape, L: float) -> Floats:
    # One part in 10^9 of a step below: inside the lower cell, where the slope is the other one.
    return columns(layout, shape, L - 1e-9 * layout.step).slope_L
