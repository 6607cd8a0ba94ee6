"""Residual tests: is anything left in the residuals that a model should have said?"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.stats import chi2

Floats = NDArray[np.float64]


def autocorrelation(residual: Floats, lags: int) -> Floats:
    """r_1..r_lags of a residual, (lags,), mean removed; zeros where it is constant."""
    e = residual - residual.mean()
    power = float(e @ e)
    if power == 0.0:
        return np.zeros(lags)
    return np.array([e[k:] @ e[:-k] for k in range(1, lags + 1)]) / power


def ljung_box(r: Floats, n: int, fitted: int = 0) -> tuple[float, float]:
    """Q = n (n + 2) sum r_k^2/(n - k) and its p under whiteness (Ljung and Box 1978, Biometrika 65, 297-303).

    r  (m,), autocorrelations from lag 1;  n  rows;  fitted  ARMA parameters taken off the degrees of freedom
    """
    m = len(r)
    q = n * (n + 2.0) * float(np.sum(r**2 / (n - np.arange(1, m + 1))))
    return q, float(chi2.sf(q, max(m - fitted, 1)))


def left_in(residual: Floats, explained: Floats, candidates: Floats) -> float:
    """p of the hypothesis that the candidates explain nothing of the residual beyond what the model did.

    A score (Lagrange multiplier) test: n R^2 of the residual on both sets of rows is chi-squared in the
    number of directions that the candidates add (Breusch 1978; Godfrey 1978). White residuals are assumed.

    residual (n,);  explained (k, n), the model's own slopes;  candidates (m, n)
    """
    basis = _orthonormal(explained)
    rest = candidates - (candidates @ basis.T) @ basis
    gone = np.linalg.norm(rest, axis=1) <= 1e-6 * (np.linalg.norm(candidates, axis=1) + 1e-300)
    rest = _orthonormal(rest[~gone], 1e-8)
    power = float(residual @ residual)
    if len(rest) == 0 or power == 0.0:
        return 1.0
    score = len(residual) * float(np.sum((rest @ residual) ** 2)) / power
    return float(chi2.sf(score, len(rest)))


def _orthonormal(rows: Floats, cut: float = 1e-12) -> Floats:
    """An orthonormal basis of the rows' span, by the Gram matrix's eigenvectors; near-zero directions dropped."""
    if len(rows) == 0:
        return rows
    scaled = rows / (np.linalg.norm(rows, axis=1, keepdims=True) + 1e-300)
    values, vectors = np.linalg.eigh(scaled @ scaled.T)
    keep = values > cut * max(values[-1], 1e-300)
    basis: Floats = (vectors[:, keep] / np.sqrt(values[keep])).T @ scaled
    return basis
