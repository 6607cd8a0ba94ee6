"""Information criteria and the fit in percent."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def aic(rss: float, n: int, p: int) -> float:
    """n ln(RSS/n) + 2 p (Akaike 1974), n rows, p parameters; additive constants left out."""
    return n * math.log(rss / n) + 2.0 * p


def aicc(rss: float, n: int, p: int) -> float | None:
    """AIC with the small-sample term 2 p (p + 1)/(n - p - 1) (Hurvich and Tsai 1989); None for n <= p + 1."""
    return aic(rss, n, p) + 2.0 * p * (p + 1) / (n - p - 1) if n > p + 1 else None


def bic(rss: float, n: int, p: int) -> float:
    """n ln(RSS/n) + p ln n (Schwarz 1978)."""
    return n * math.log(rss / n) + p * math.log(n)


def fpe(rss: float, n: int, p: int) -> float:
    """Final prediction error RSS/n (n + p)/(n - p) (Akaike 1969), for n > p."""
    return rss / n * (n + p) / (n - p)


def fit_percent(measured: Floats, modelled: Floats) -> float | None:
    """NRMSE fit 100 (1 - |y - y_model| / |y - mean(y)|); None where the measured signal never moves."""
    spread = float(np.linalg.norm(measured - measured.mean()))
    if spread == 0.0:
        return None
    return 100.0 * (1.0 - float(np.linalg.norm(measured - modelled)) / spread)
