"""The exact answer of 1/(P s^2 + S s + 1) to a command held or straight between samples, on any time axis.

S = T1 + T2 and P = T1 T2 describe two lags, equal lags and an underdamped pair alike, without a seam between them.
With the command held, q = y - u and r = dy/dt move freely between samples

    q(e) = c0 q + c1 r,   r(e) = -(c1/P) q + c2 r

with c0, c1, c2 from `motion`; with a straight one of slope m, q + m S and r - m do, about y = u - m S + m e. At the
samples both follow from the moves of the command by one second-order recursion each.
(Zero-order hold of a second-order system: Åström and Wittenmark, Computer-Controlled Systems, table 2.1.)
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, overload

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.lapack import dtbtrs
from scipy.signal import lfilter

Floats = NDArray[np.float64]


@overload
def motion(S: float, P: float, since: float) -> tuple[float, float, float]: ...
@overload
def motion(S: float, P: float, since: Floats) -> tuple[Floats, Floats, Floats]: ...
def motion(S: float, P: float, since: float | Floats) -> tuple[Any, Any, Any]:
    """c0, c1, c2 at times `since` >= 0 (any shape, s): the free motion of q and r; S, P > 0 in s and s^2."""
    # A single time is asked for often, and there numpy takes ten times as long.
    of: Any = np if isinstance(since, np.ndarray) else math
    sigma = S / (2.0 * P)
    square = sigma * sigma - 1.0 / P
    if square > 0.0:
        delta = math.sqrt(square)
        fast = sigma + delta
        slow = 1.0 / (P * fast)  # not sigma - delta, which loses its digits when the lags differ much
        late = of.exp(-slow * since)
        c1 = late * -of.expm1(-2.0 * delta * since) / (2.0 * delta)
        even = 0.5 * (late + of.exp(-fast * since))
    else:
        omega = max(math.sqrt(-square), 1e-150)  # of equal lags: sin(omega t)/omega is t there
        decay = of.exp(-sigma * since)
        c1 = decay * of.sin(omega * since) / omega
        even = decay * of.cos(omega * since)
    return even + sigma * c1, c1, even - sigma * c1


@dataclass(frozen=True, slots=True, eq=False)
class Taps:
    """The answer at one instant between samples, as filters of the command's moves on a uniform grid.

    `since` s after a sample: y - u is the moves through speed/poles, plus by_slope times the command's slope per s;
    dy/dt the moves through rate/poles, plus rate_by_slope times it.
    """

    poles: Floats
    speed: Floats
    rate: Floats
    by_slope: float
    rate_by_slope: float


def pair_taps(step: float, since: float, S: float, P: float, *, straight: bool = False) -> Taps:
    """Taps of 1/(P s^2 + S s + 1), the move from row j to j + 1 given at row j;  step, since, S  s;  P  s^2."""
    c0, c1, c2 = motion(S, P, step)
    g_q, g_r = _left_by_a_move(step, S, P, straight)
    q = np.array([0.0, g_q, c1 * g_r - c2 * g_q])
    r = np.array([0.0, g_r, -c1 / P * g_q - c0 * g_r])
    e0, e1, e2 = motion(S, P, since)
    by_slope = since - S + e0 * S - e1 if straight else 0.0
    rate_by_slope = 1.0 - e1 * S / P - e2 if straight else 0.0
    poles = np.array([1.0, -(c0 + c2), math.exp(-S / P * step)])
    return Taps(poles, e0 * q + e1 * r, e2 * r - e1 / P * q, by_slope, rate_by_slope)


def _left_by_a_move(step: float, S: float, P: float, straight: bool) -> tuple[float, float]:
    """What a move of the command by 1 leaves in q and r at the next sample."""
    if not straight:
        return -1.0, 0.0
    c0, c1, c2 = motion(S, P, step)
    return (-S * (1.0 - c0) - c1) / step, (1.0 - c2 - c1 * S / P) / step


def pair_states(
    command: Floats, step: float | Floats, S: float, P: float, *, straight: bool = False
) -> tuple[Floats, Floats]:
    """q = y - u and r = dy/dt (per s) at the samples, from a start settled at command[0].

    command  (n,);  step  s, one sample time or (n-1,) intervals;  S  s;  P  s^2
    straight the command is straight between samples instead of held
    """
    c0, c1, c2 = motion(S, P, step)
    # What a move of the command by 1 leaves in q and r at the next sample.
    if straight:
        g_q, g_r = (-S * (1.0 - c0) - c1) / step, (1.0 - c2 - c1 * S / P) / step
    else:
        g_q, g_r = -np.ones_like(c0), np.zeros_like(c0)
    moves = np.diff(command)
    if not isinstance(step, np.ndarray):
        poles = [1.0, -float(c0 + c2), math.exp(-S / P * step)]
        drive = np.concatenate((moves, [0.0]))  # the move from row j to j + 1 shows at j + 1
        q = lfilter([0.0, float(g_q), float(c1 * g_r - c2 * g_q)], poles, drive)
        r = lfilter([0.0, float(g_r), float(-c1 / P * g_q - c0 * g_r)], poles, drive)
        return np.asarray(q), np.asarray(r)
    # A banded triangular system over q[0], r[0], q[1], r[1], ...: linear cost on any axis.
    n = len(command)
    band = np.zeros((4, 2 * n))
    band[0] = 1.0
    band[2, 0 : 2 * n - 2 : 2], band[3, 0 : 2 * n - 2 : 2] = -c0, c1 / P
    band[1, 1 : 2 * n - 2 : 2], band[2, 1 : 2 * n - 2 : 2] = -c1, -c2
    right = np.zeros(2 * n)
    right[2::2], right[3::2] = g_q * moves, g_r * moves
    state, info = dtbtrs(band, right, uplo="L")
    assert info == 0  # the diagonal is 1
    pairs = np.asarray(state, dtype=np.float64).reshape(n, 2)
    return pairs[:, 0].copy(), pairs[:, 1].copy()
