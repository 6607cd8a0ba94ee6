"""Residual tests: is anything left in the residuals that a model should have said?"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtrc

from ident.evidence.normal import lengths

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
    return q, float(chdtrc(max(m - fitted, 1), q))


def left_in(rows: Floats, own: int) -> float:
    """p of the hypothesis that candidate rows explain nothing of a residual beyond what the model did.

    A score (Lagrange multiplier) test: n R^2 of the residual on both sets of rows is chi-squared in the
    number of directions that the candidates add (Breusch 1978; Godfrey 1978). White residuals are assumed.

    rows  (1 + own + m, n): the residual, the model's `own` slopes, m candidates
    """
    gram = rows @ rows.T
    if gram[0, 0] == 0.0:
        return 1.0
    scale = lengths(gram)
    gram /= scale[:, None] * scale
    explained, directions = _explained_share(gram, 1 + own)
    both, all_directions = _explained_share(gram, len(gram))
    if all_directions <= directions:
        return 1.0
    return float(chdtrc(all_directions - directions, rows.shape[1] * max(both - explained, 0.0)))


def _explained_share(gram: Floats, rows: int, cut: float = 1e-10) -> tuple[float, int]:
    """Share of row 0's power explained by rows 1..rows-1 of unit rows with this Gram matrix, and their rank."""
    values, vectors = np.linalg.eigh(gram[1:rows, 1:rows])
    keep = values > cut * values[-1]
    along = vectors[:, keep].T @ gram[1:rows, 0]
    return float(np.sum(along**2 / values[keep])), int(np.count_nonzero(keep))
