"""The exact answer of a first-order lag to a command known at its samples, on any time axis.

Between samples the command is held (u(t) = u[j] for t[j] <= t < t[j+1]), or, for a smooth one, straight; before the
record it stands at u[0]. With x' = (u - x)/T the gap q = x - u follows at the samples

    q[j+1] = a q[j] - g (u[j+1] - u[j]),   a = exp(-step/T),   g = 1 (held) or T (1 - a)/step (straight)

and anywhere between them x(t) = u[j] + q[j] E (held) or u[j] + m e + q[j] E - m T (1 - E) (straight, slope m), with
e = t - t[j] and E = exp(-e/T). A dead time L only asks for x at t - L, so one pass serves every L (modified
z-transform; Åström and Wittenmark, Computer-Controlled Systems).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.lapack import dtbtrs
from scipy.signal import lfilter

Floats = NDArray[np.float64]


def lag_gap(command: Floats, step: float | Floats, T: float, *, straight: bool = False) -> Floats:
    """q at the samples, for a unit-gain lag that starts settled at command[0].

    command  (n,);  step  s, > 0: one sample time, or (n-1,) intervals;  T  s, > 0
    straight the command is straight between samples instead of held
    """
    a = np.exp(-np.asarray(step) / T)
    if isinstance(step, np.ndarray):
        g = T * (1.0 - a) / step if straight else 1.0
        return _recursion(a, -g * np.diff(command))
    moved = command - command[0]
    held = np.asarray(lfilter([0.0, -np.expm1(-step / T)], [1.0, -float(a)], moved)) - moved
    return np.asarray(held * (-T * np.expm1(-step / T) / step) if straight else held)


def lag_gap_slope(
    gap: Floats, step: float | Floats, T: float, *, command: Floats | None = None, straight: bool = False
) -> Floats:
    """dq/dT at the samples, (n,), from q of the same T; a straight command is needed for its own share."""
    a = np.exp(-np.asarray(step) / T)
    a_T = a * step / T**2
    if isinstance(step, np.ndarray):
        drive = a_T * gap[:-1]
        if straight and command is not None:
            drive = drive - ((1.0 - a) / step - a / T) * np.diff(command)
        return _recursion(a, drive)
    if not straight:
        return np.asarray(lfilter([0.0, float(a_T)], [1.0, -float(a)], gap))
    g, g_T = T * (1.0 - a) / step, (1.0 - a) / step - a / T
    held = gap / g
    return np.asarray(g_T * held + g * lfilter([0.0, float(a_T)], [1.0, -float(a)], held))


def _recursion(a: Floats, drive: Floats) -> Floats:
    """q[j+1] = a[j] q[j] + drive[j] from q[0] = 0."""
    # A bidiagonal system, solved forward by LAPACK: linear cost and no growth of rounding, as a <= 1.
    n = len(a) + 1
    band = np.ones((2, n))
    band[1, :-1] = -a
    x, info = dtbtrs(band, np.concatenate(([0.0], drive)), uplo="L")
    assert info == 0  # the diagonal is 1
    return np.asarray(x, dtype=np.float64).reshape(n)
