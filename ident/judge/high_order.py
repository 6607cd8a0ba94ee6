"""High order: an ARX model with so many terms that it presumes no structure, by least squares on lagged products.

    y[k] + a1 y[k-s] + ... + a20 y[k-20 s] = b1 U[k-s] + ... + bm U[k-m s] + c,     U[k] = mean(u[k], ..., u[k+s-1])

The stride s is the number of rows per lag, so that the terms span the plant's whole response however fast the log was
taken; all rows are used, and errors that overlap within a stride are counted as one. Neighbouring lags share all but
their end rows, so each product of two lagged signals follows from the one before it: the cost is that of a few
hundred dot products. (Ljung 1999, section 10.3: high-order ARX models approximate any linear system with any noise.)
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve
from scipy.signal import lfilter

from ident.estimate.lagged import Runs
from ident.evidence.normal import lengths
from ident.record.segments import Floats

Lags = NDArray[np.int64]

RIDGE = 1e-10  # of each column's length squared: too little to move a noisy estimate, enough for one without noise


@dataclass(frozen=True, slots=True, eq=False)
class HighOrder:
    """a (na,) and b (m,) of lags 1, 2, ... strides; covariance (na + m, na + m); step, s, of a stride."""

    a: Floats
    b: Floats
    covariance: Floats
    step: float

    @property
    def poles(self) -> NDArray[np.complex128]:
        """(na,)"""
        return np.asarray(np.roots(np.concatenate(([1.0], self.a))), dtype=np.complex128)

    def step_response(self, strides: int) -> tuple[Floats, Floats]:
        """Response to a unit step at 0, 1, ..., strides-1, and its std; strides at most the lags of b."""
        A, na, m = np.concatenate(([1.0], self.a)), len(self.a), len(self.b)
        one = lfilter([1.0], A, np.ones(strides))
        value = lfilter(np.concatenate(([0.0], self.b)), A, np.ones(strides))
        by_a = -lfilter([1.0], A, value)
        slopes = np.zeros((na + m, strides))
        for i in range(na):
            slopes[i, i + 1 :] = by_a[: max(strides - i - 1, 0)]
        for j in range(m):
            slopes[na + j, j + 1 :] = one[: max(strides - j - 1, 0)]
        return np.asarray(value), np.sqrt(np.maximum(np.sum(slopes * (self.covariance @ slopes), axis=0), 0.0))

    def gain_at(self, w: Floats) -> tuple[Floats, Floats]:
        """Modulus of the response at w, rad/s, (n,), and its std."""
        back = np.exp(-1j * self.step * w)
        to_a = back[:, None] ** np.arange(1, len(self.a) + 1)
        to_b = back[:, None] ** np.arange(1, len(self.b) + 1)
        below = 1.0 + to_a @ self.a
        response = (to_b @ self.b) / below
        slopes = np.concatenate((-response[:, None] * to_a, to_b), axis=1) / below[:, None]
        size = np.abs(response)
        along = (np.conj(response)[:, None] * slopes).real / np.maximum(size, 1e-300)[:, None]
        return size, np.sqrt(np.maximum(np.sum(along * (along @ self.covariance), axis=1), 0.0))


def high_order(runs: Runs, na: int, nb: int, stride: int = 1) -> HighOrder | None:
    """The least-squares model; None where the runs have too few rows for it."""
    columns, skip = na + nb + 2, max(na, nb) * stride
    gram, rows = np.zeros((columns, columns)), runs.rows(skip)
    if rows < 2 * columns * stride:
        return None
    for run in runs.runs:
        if run.rows > skip:
            total = np.cumsum(np.concatenate(([0.0], run.command)))
            mean = (total[stride:] - total[:-stride]) / stride
            # Means that would need commands after the log stand at its last rows, where no lag reaches.
            mean = np.concatenate((mean, np.zeros(stride - 1)))
            gram += _lagged_products(run.speed, mean, na, nb, skip, stride)
    size = lengths(gram)
    scaled = gram / (size[:, None] * size)
    X = scaled[1:, 1:] + RIDGE * np.eye(columns - 1)
    factor = cho_factor(X)
    found = cho_solve(factor, scaled[1:, 0])
    rss = max(float(scaled[0, 0] - found @ scaled[1:, 0]), 0.0)
    # Errors within a stride overlap: at worst a stride of them says no more than one.
    variance = rss * stride / max(rows - (columns - 1) * stride, 1)
    ratio = size[0] / size[1:]
    covariance = cho_solve(factor, np.eye(columns - 1)) * variance * ratio[:, None] * ratio
    found = found * ratio
    p = na + nb
    return HighOrder(found[:na], found[na:p], covariance[:p, :p], runs.step * stride)


def _lagged_products(y: Floats, u: Floats, na: int, nb: int, skip: int, s: int) -> Floats:
    """Gram matrix of y[k], -y[k-s] .. -y[k-na s], u[k-s] .. u[k-nb s], 1 over k = skip..n-1."""
    n, p = len(y), 1 + na + nb
    gram = np.empty((p + 1, p + 1))
    ys, us = slice(0, 1 + na), slice(1 + na, p)
    lag_y, lag_u = s * np.arange(na + 1), s * np.arange(1, nb + 1)
    gram[ys, ys] = _products(y, y, lag_y, lag_y, skip, s)
    gram[us, us] = _products(u, u, lag_u, lag_u, skip, s)
    gram[ys, us] = _products(y, u, lag_y, lag_u, skip, s)
    gram[us, ys] = gram[ys, us].T
    total_y, total_u = (np.concatenate(([0.0], np.cumsum(v))) for v in (y, u))
    gram[ys, p] = total_y[n - lag_y] - total_y[skip - lag_y]
    gram[us, p] = total_u[n - lag_u] - total_u[skip - lag_u]
    gram[p, :p] = gram[:p, p]
    gram[p, p] = n - skip
    gram[1 : 1 + na] *= -1.0
    gram[:, 1 : 1 + na] *= -1.0
    return gram


def _products(x: Floats, z: Floats, x_lags: Lags, z_lags: Lags, skip: int, s: int) -> Floats:
    """(i, j) sum over k = skip..n-1 of x[k - x_lags[i]] z[k - z_lags[j]], lags s apart."""
    n, i0, j0 = len(x), int(x_lags[0]), int(z_lags[0])
    out = np.empty((len(x_lags), len(z_lags)))
    out[0] = [x[skip - i0 : n - i0] @ z[skip - j : n - j] for j in z_lags.tolist()]
    out[:, 0] = [x[skip - i : n - i] @ z[skip - j0 : n - j0] for i in x_lags.tolist()]
    # One lag more on both sides takes the s rows before the first and drops the last s.
    within = np.arange(-s, 0)
    taken = x[skip + within - x_lags[:-1, None]] @ z[skip + within - z_lags[:-1, None]].T
    dropped = x[n + within - x_lags[:-1, None]] @ z[n + within - z_lags[:-1, None]].T
    change = taken - dropped
    for row in range(1, len(x_lags)):
        out[row, 1:] = out[row - 1, :-1] + change[row - 1]
    return out
