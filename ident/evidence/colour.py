"""Colour: an autoregressive model of noise, whitening by it, and what it does to a least-squares covariance.

The reflection coefficients are Burg's, which stay below 1 and, unlike those of the sample autocorrelation, are nearly
unbiased for slow noise (Burg 1975, thesis, Stanford; Kay, Modern Spectral Estimation, 1988). Levinson's recursion gives
the predictor of every lower order on the way, so the first rows of a record are whitened exactly too.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from ident.evidence.normal import lengths

Floats = NDArray[np.float64]

MOST = 60  # highest order looked at
ROWS_PER_ORDER = 20
SCREEN = 20  # orders of the quick look that finds most noise white
# A short model passes the criterion and still makes slow noise look faster than it is, and intervals too narrow:
# coloured noise gets half as many terms again as the criterion asks for, and at least so many.
AT_LEAST, MORE = 20, 1.5


@dataclass(frozen=True, slots=True, eq=False)
class Colour:
    """e[k] + a[0] e[k-1] + ... + a[p-1] e[k-p] = w[k], w white.

    predictors  a of the orders 0..p;  variances  of w for each: variances[-1] is the model's
    """

    predictors: tuple[Floats, ...]
    variances: Floats

    @property
    def order(self) -> int:
        return len(self.predictors) - 1

    @property
    def white(self) -> bool:
        return self.order == 0

    @property
    def variance(self) -> float:
        return float(self.variances[-1])

    @property
    def taps(self) -> Floats:
        """1, a[0], ..., a[p-1]."""
        return np.concatenate(([1.0], self.predictors[-1]))

    def whiten(self, rows: Floats) -> Floats:
        """Rows (..., n) of one unbroken run, whitened; the first p with the lower orders, at equal variance."""
        if self.white:
            return rows
        out = np.asarray(lfilter(self.taps, [1.0], rows, axis=-1))
        for k in range(min(self.order, rows.shape[-1])):
            ahead = rows[..., k] + rows[..., :k][..., ::-1] @ self.predictors[k]
            out[..., k] = ahead * math.sqrt(self.variances[-1] / self.variances[k])
        return out


WHITE = Colour((np.zeros(0),), np.ones(1))


def noise_colour(parts: Sequence[Floats]) -> Colour:
    """The colour of noise seen in unbroken runs, each (n,), zero-mean: white where BIC finds no more in it."""
    n = sum(len(part) for part in parts)
    most = max(min(MOST, n // ROWS_PER_ORDER, min(len(part) for part in parts) // 4), 0)
    power = sum(float(part @ part) for part in parts) / n
    if power == 0.0 or most == 0:
        return Colour((np.zeros(0),), np.array([power]))
    if _looks_white(parts, min(most, SCREEN), power, n):
        return Colour((np.zeros(0),), np.array([power]))
    full = _burg(parts, most, power)
    order = np.arange(full.order + 1)
    likelihood = n * np.log(np.maximum(full.variances, 1e-300))
    if int(np.argmin(likelihood + order * math.log(n))) == 0:
        return Colour(full.predictors[:1], full.variances[:1])
    aicc = likelihood + 2.0 * order + 2.0 * order * (order + 1) / (n - order - 1)
    chosen = min(max(math.ceil(MORE * int(np.argmin(aicc))), AT_LEAST), full.order)
    return Colour(full.predictors[: chosen + 1], full.variances[: chosen + 1])


def _looks_white(parts: Sequence[Floats], most: int, power: float, n: int) -> bool:
    """Whether BIC, over the orders of a quick look (Levinson on sample autocovariances), finds no colour."""
    c = [power * n, *(sum(float(p[k:] @ p[:-k]) for p in parts) for k in range(1, most + 1))]
    a, variance, gained = np.zeros(0), c[0], 0.0
    for order in range(1, most + 1):
        reflection = -(c[order] + float(a @ c[order - 1 : 0 : -1])) / variance
        a = np.append(a + reflection * a[::-1], reflection)
        variance *= 1.0 - reflection**2
        if variance <= 0.0:
            return False
        gained += n * math.log1p(-(reflection**2)) + math.log(n)
        if gained < 0.0:
            return False
    return True


def _burg(parts: Sequence[Floats], most: int, power: float) -> Colour:
    forward, backward = [p.copy() for p in parts], [p.copy() for p in parts]
    a = np.zeros(0)
    predictors, variances = [a], [power]
    for _ in range(most):
        ahead, behind = [f[1:] for f in forward], [b[:-1] for b in backward]
        across = sum(float(f @ b) for f, b in zip(ahead, behind, strict=True))
        both = sum(float(f @ f) + float(b @ b) for f, b in zip(ahead, behind, strict=True))
        reflection = -2.0 * across / both if both > 0.0 else 0.0
        if abs(reflection) >= 1.0:
            break
        forward = [f + reflection * b for f, b in zip(ahead, behind, strict=True)]
        backward = [b + reflection * f for f, b in zip(ahead, behind, strict=True)]
        a = np.append(a + reflection * a[::-1], reflection)
        predictors.append(a)
        variances.append(variances[-1] * (1.0 - reflection**2))
    return Colour(tuple(predictors), np.array(variances))


def coloured_covariance(jacobian: Floats, colour: Colour) -> Floats:
    """Covariance (k, k) of a least-squares estimate with slopes (k, n) and residuals of this colour.

    With residuals of covariance R it is (JJ')^-1 JRJ' (JJ')^-1, and JRJ' = variance |J passed backwards through
    1/A|^2, as R = variance (A'A)^-1 for a filter matrix A.
    """
    inverse = inverse_gram(jacobian @ jacobian.T)
    if colour.white:
        return np.asarray(colour.variance * inverse)
    passed = lfilter([1.0], colour.taps, jacobian[:, ::-1], axis=1)
    middle = colour.variance * (passed @ passed.T)
    return np.asarray(inverse @ middle @ inverse)


def inverse_gram(gram: Floats) -> Floats:
    """(k, k), the inverse of a Gram matrix of rows of very unlike size; directions that the rows lack get nothing."""
    scale = lengths(gram)
    inverse = np.linalg.pinv(gram / (scale[:, None] * scale), rcond=1e-14, hermitian=True)
    return np.asarray(inverse / (scale[:, None] * scale))
