"""Equation: the least-squares difference equation at given orders, and what it says of a record.

The free offset: the means of the whole record are taken off both signals, and a constant beyond them stays in the
equation where it lowers BIC (a record that starts or ends away from balance has means that are not on the plant's
line). Under Ljung's assumption, noise e/A with e white, the covariance is sigma^2 (X'X)^-1.
(Ljung 1999, sections 7.3 and 9.4.)
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.linalg import solve_triangular
from scipy.signal import lfilter

from ident.errors import NotIdentifiable
from ident.estimate.lagged import Run, Runs, triangle
from ident.evidence.criteria import bic
from ident.plants.arx import Arx
from ident.record.segments import Floats

FORGOTTEN = 40.0  # neper, below rounding
DEPENDENT = 1e-13  # smallest over largest singular value of unit columns


@dataclass(frozen=True, slots=True, eq=False)
class Equation:
    """A fitted difference equation in deviations from the record's means.

    model       constant: its free term, speed unit
    covariance  (na + nb, na + nb) of a, then b
    rss, rows   sum of squared equation errors and how many;  exact: they are rounding
    skip        rows of history that each run gives
    free        numbers fitted: na + nb, and the constant where kept
    """

    model: Arx
    constant: float
    covariance: Floats
    rss: float
    rows: int
    exact: bool
    skip: int
    free: int

    @property
    def coefficients(self) -> Floats:
        return np.array([*self.model.a, *self.model.b])

    def errors(self, run: Run) -> Floats:
        """Equation errors e (n - skip,) of a run: one-step prediction errors."""
        past = np.convolve(run.speed, (1.0, *self.model.a), "full")[self.skip : run.rows]
        return np.asarray(past - self._drive(run))

    def simulate(self, run: Run, known: int | None = None) -> Floats:
        """Speeds (n,) of a run simulated by a stable model, NaN on the first `skip` rows, which lack commands.

        The initial state, na numbers, is the one that brings the simulation nearest to the first `known` speeds
        (None: all) in least squares: started from single noisy speeds, a slow plant would carry their noise along.
        """
        A = (1.0, *self.model.a)
        out = np.full(run.rows, np.nan)
        n, na = run.rows - self.skip, len(self.model.a)
        if n <= 0:
            return out
        forced = lfilter([1.0], A, self._drive(run))
        if na and n > na:
            # A state of the filter comes out as the impulse response, later by one row per place.
            rows = min(n, self._memory() + na)
            impulse = lfilter([1.0], A, np.concatenate(([1.0], np.zeros(rows - 1))))
            free = np.zeros((rows, na))
            for i in range(na):
                free[i:, i] = impulse[: rows - i]
            seen = max(min(known if known is not None else rows, rows + self.skip) - self.skip, na)
            gap = run.speed[self.skip : self.skip + rows] - forced[:rows]
            forced[:rows] += free @ np.linalg.lstsq(free[:seen], gap[:seen], rcond=None)[0]
        out[self.skip :] = forced
        return out

    def _memory(self) -> int:
        """Rows after which an initial state is below rounding."""
        slowest = max(abs(z) for z in self.model.poles)
        return max(int(FORGOTTEN / -math.log(slowest)), 1) if slowest > 0.0 else 1

    def _drive(self, run: Run) -> Floats:
        """The command's part and the constant, at rows skip..n-1."""
        reach = np.concatenate((np.zeros(self.model.delay), self.model.b))
        return np.convolve(run.command, reach, "full")[self.skip : run.rows] + self.constant


def fit_equation(runs: Runs, na: int, nb: int, delay: int) -> Equation:
    """Least squares at given orders, na >= 0, nb >= 1, delay >= 1.

    Raises NotIdentifiable: too-short, or not-identifiable where the record cannot tell the coefficients apart.
    """
    lags = range(delay, delay + nb)
    skip = max(na, lags[-1])
    R = triangle(runs, na, lags, skip)
    n, p = runs.rows(skip), na + nb
    _require_independent(R[:, : p + 1], na, nb, delay)
    floor = n * runs.smallest**2
    with_constant = max(float(R[p + 1, p + 1] ** 2), floor)
    without = max(float(R[p, p + 1] ** 2 + R[p + 1, p + 1] ** 2), floor)
    keep = bic(with_constant, n, p + 1) < bic(without, n, p)
    free, rss = (p + 1, with_constant) if keep else (p, without)
    found = solve_triangular(R[:free, :free], R[:free, -1])
    inverse = solve_triangular(R[:free, :free], np.eye(free))
    covariance = (inverse @ inverse.T)[:p, :p] * rss / (n - free)
    return Equation(
        model=Arx(found[:na].tolist(), found[na:p].tolist(), delay, runs.step),
        constant=float(found[p]) if keep else 0.0,
        covariance=np.asarray(covariance),
        rss=rss,
        rows=n,
        exact=rss <= floor,
        skip=skip,
        free=free,
    )


def _require_independent(R: Floats, na: int, nb: int, delay: int) -> None:
    length = np.linalg.norm(R, axis=0)
    sizes = np.linalg.svd(R / np.where(length == 0.0, 1.0, length), compute_uv=False)
    if (length == 0.0).any() or sizes[-1] <= DEPENDENT * sizes[0]:
        raise NotIdentifiable(
            "not-identifiable",
            "This log cannot tell the ARX coefficients of these orders apart: its command moves too little, or fewer "
            "coefficients already explain it. Ask for lower orders, or log a command that moves more often.",
            {"na": na, "nb": nb, "delay": delay},
        )
