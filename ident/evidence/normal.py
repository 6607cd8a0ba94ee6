"""Normal equations, scaled: least squares from Gram matrices of rows of very unlike size."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.blas import dgemm

Floats = NDArray[np.float64]

RIDGE = 1e-13  # relative; keeps collinear rows solvable without moving any other


def gram_of(rows: Floats) -> Floats:
    """Products (k, k) of rows (k, n) with one another, for a few long rows.

    rows @ rows.T would go to the symmetric product of BLAS, which takes several times as long for so few rows.
    """
    return np.asarray(dgemm(1.0, rows.T, rows.T, trans_a=True))


def lengths(gram: Floats) -> Floats:
    """Lengths (..., k) of the rows behind Gram matrices (..., k, k); a row of nothing has length 1."""
    size = np.sqrt(np.maximum(_diagonal(gram), 0.0))
    size[size == 0.0] = 1.0
    return np.asarray(size)


def solve_normal(gram: Floats, against: Floats) -> Floats:
    """Solutions (..., k) of gram x = against, (..., k, k) and (..., k); a row that adds nothing gets nothing."""
    size = lengths(gram)
    scaled = gram / (size[..., :, None] * size[..., None, :])
    _diagonal(scaled)[...] += RIDGE
    return np.asarray(np.linalg.solve(scaled, (against / size)[..., None])[..., 0] / size)


def _diagonal(matrices: Floats) -> Floats:
    """A view of the diagonals (..., k) of (..., k, k)."""
    return np.asarray(np.einsum("...ii->...i", matrices))
