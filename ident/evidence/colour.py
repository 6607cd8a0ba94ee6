"""Colour: an autoregressive model of the residuals, and what it does to a least-squares covariance.

With residuals of covariance R the estimate (J'J)^-1 J'e has covariance (J'J)^-1 J'RJ (J'J)^-1, wider (or narrower)
than white noise of the same power would give. R follows from an AR(p) model whose order the data choose.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from ident.evidence.normal import lengths

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Colour:
    """e[k] + a[0] e[k-1] + ... = w[k], w white of variance `variance`; a of length 0 is white noise."""

    a: Floats
    variance: float

    @property
    def white(self) -> bool:
        return len(self.a) == 0


def autoregression(residual: Floats, most: int = 20) -> Colour:
    """AR model of a residual (n,), mean removed: order 0..most with the least AICc, by Levinson's recursion.

    (Yule and Walker's equations; Durbin 1960, Rev. Int. Stat. Inst. 28, 233-244.)
    """
    n = len(residual)
    most = max(min(most, n // 10), 0)
    e = residual - residual.mean()
    c = np.array([e @ e, *(e[k:] @ e[:-k] for k in range(1, most + 1))]) / n
    if c[0] == 0.0:
        return Colour(np.zeros(0), 0.0)
    a, variance = np.zeros(0), float(c[0])
    best, least = Colour(a, variance), n * math.log(variance)
    for p in range(1, most + 1):
        reflection = -(float(c[p]) + float(a @ c[p - 1 : 0 : -1])) / variance
        a = np.append(a + reflection * a[::-1], reflection)
        variance *= 1.0 - reflection**2
        if variance <= 0.0:
            break
        criterion = n * math.log(variance) + 2.0 * p + 2.0 * p * (p + 1) / (n - p - 1)
        if criterion < least:
            best, least = Colour(a, variance), criterion
    return best


def coloured_covariance(jacobian: Floats, colour: Colour) -> Floats:
    """Covariance (k, k) of a least-squares estimate with slopes (k, n) and residuals of this colour.

    J'RJ = variance * |J passed backwards through 1/A|^2, as R = variance (A'A)^-1 for a filter matrix A.
    """
    gram = jacobian @ jacobian.T
    scale = lengths(gram)
    inverse = np.linalg.pinv(gram / (scale[:, None] * scale), rcond=1e-14, hermitian=True)
    inverse /= scale[:, None] * scale
    if colour.white:
        return np.asarray(colour.variance * inverse)
    passed = lfilter([1.0], np.concatenate(([1.0], colour.a)), jacobian[:, ::-1], axis=1)
    middle = colour.variance * (passed @ passed.T)
    return np.asarray(inverse @ middle @ inverse)
