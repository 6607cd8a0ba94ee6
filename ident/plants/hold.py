"""The exact answer of a first-order lag to a held command, on any time axis.

Between samples the command is held: u(t) = u[j] for t[j] <= t < t[j+1], and u[0] before the record. With
x' = (u - x)/T the state at the samples follows

    x[j+1] = a[j] x[j] + (1 - a[j]) u[j],     a[j] = exp(-(t[j+1] - t[j])/T),     x[0] = u[0],

and anywhere between them x(t) = u[j] + (x[j] - u[j]) exp(-(t - t[j])/T). A dead time L only asks for x at t - L,
so one pass serves every L (modified z-transform; Åström and Wittenmark, Computer-Controlled Systems).
The functions return q = x - u, the part that the exponential multiplies.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.lapack import dtbtrs
from scipy.signal import lfilter

Floats = NDArray[np.float64]


def lag_gap(command: Floats, step: float | Floats, T: float) -> Floats:
    """q = x - u at the samples, for a unit-gain lag that starts settled at command[0].

    command  (n,);  step  s, > 0: one sample time, or (n-1,) intervals;  T  s, > 0
    """
    moved = command - command[0]
    a = np.exp(-np.asarray(step) / T)
    answer = _recursion(a, (1.0 - a) * moved[:-1] if isinstance(step, np.ndarray) else moved, step, T)
    return np.asarray(answer - moved)


def lag_gap_slope(gap: Floats, step: float | Floats, T: float) -> Floats:
    """dq/dT at the samples, (n,), from q of the same T."""
    if isinstance(step, np.ndarray):
        a = np.exp(-step / T)
        return _recursion(a, a * step / T**2 * gap[:-1], step, T)
    a_T = float(np.exp(-step / T)) * step / T**2
    return np.asarray(lfilter([0.0, a_T], [1.0, -float(np.exp(-step / T))], gap))


def _recursion(a: Floats, drive: Floats, step: float | Floats, T: float) -> Floats:
    """x[j+1] = a[j] x[j] + drive[j] from x[0] = 0; for one step, drive is the input of the lag."""
    if not isinstance(step, np.ndarray):
        pole = float(a)
        return np.asarray(lfilter([0.0, -np.expm1(-step / T)], [1.0, -pole], drive))
    # A bidiagonal system, solved forward by LAPACK: linear cost and no growth of rounding, as a <= 1.
    n = len(a) + 1
    band = np.ones((2, n))
    band[1, :-1] = -a
    x, info = dtbtrs(band, np.concatenate(([0.0], drive)), uplo="L")
    assert info == 0  # the diagonal is 1
    return np.asarray(x, dtype=np.float64).reshape(n)
