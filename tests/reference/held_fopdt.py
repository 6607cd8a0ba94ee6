"""The published difference equation of a FOPDT under a held command: the truth that fits are tested against.

With L = d h + f, 0 <= f < h: a = exp(-h/T), b0 = K (1 - exp(-(h-f)/T)), b1 = K (exp(-(h-f)/T) - a) and
y[k+1] = a y[k] + b0 u[k-d] + b1 u[k-d-1] (Åström and Wittenmark, Computer-Controlled Systems, modified z-transform).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

Floats = NDArray[np.float64]


def coefficients(K: float, T: float, L: float, h: float) -> tuple[int, float, float, float]:
    """d, a, b0, b1."""
    d = int(L / h + 1e-9)
    f = max(L - d * h, 0.0)
    a = np.exp(-h / T)
    return d, float(a), float(K * (1 - np.exp(-(h - f) / T))), float(K * (np.exp(-(h - f) / T) - a))


def respond(u: Floats, h: float, K: float, T: float, L: float, offset: float = 0.0) -> Floats:
    """Speed at the samples for a plant settled at u[0] before the first row."""
    d, a, b0, b1 = coefficients(K, T, L, h)
    numerator = np.zeros(d + 3)
    numerator[d + 1], numerator[d + 2] = b0, b1
    return offset + K * u[0] + np.asarray(lfilter(numerator, [1.0, -a], u - u[0]))
