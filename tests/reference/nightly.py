"""Nights of a loop under PI, simulated many at once without the package under test.

x' = A x + B u(t - L) for one or two lags in a row, u held between samples, exact over a sample by the matrix
exponential (van Loan 1978, IEEE Trans. Autom. Control 23, 395-404); white noise on the measured speed, which the
controller acts on; trapezoidal integral. Rows are samples, columns nights.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.linalg import expm

H = 0.1  # s


@dataclass(frozen=True)
class Loop:
    """Plant K exp(-L s)/((T1 s + 1)(T2 s + 1)), T2 = 0 for one lag; PI Kp, Ti; noise, standard deviation."""

    K: float = 14.6
    T1: float = 1.83
    T2: float = 0.0
    L: float = 0.37
    Kp: float = 0.075
    Ti: float = 2.3
    noise: float = 2.0


def held(loop: Loop, seconds: float) -> tuple[np.ndarray, np.ndarray]:
    """State and input matrices over a stretch of held command, unit gain."""
    lags = [loop.T1, loop.T2] if loop.T2 > 0 else [loop.T1]
    n = len(lags)
    block = np.zeros((n + 1, n + 1))
    for i, T in enumerate(lags):
        block[i, i] = -1 / T
        block[i, i - 1 if i else n] = 1 / T
    e = expm(block * seconds)
    return e[:n, :n], e[:n, n]


def closed_loop(
    loop: Loop, setpoint: np.ndarray, rng: np.random.Generator, gain: np.ndarray | float = 1.0
) -> tuple[np.ndarray, np.ndarray]:
    """(command, speed), each (rows, nights), from rest at the first setpoint; gain scales K per night."""
    rows, nights = setpoint.shape
    K = loop.K * np.broadcast_to(np.asarray(gain, dtype=float), (nights,))
    d = math.floor(loop.L / H)
    A1, B1 = held(loop, loop.L - d * H)  # the sample begins under the older command
    A2, B2 = held(loop, (d + 1) * H - loop.L)
    integral = setpoint[0] / K
    past = [integral] * (d + 2)
    x = np.outer(np.ones(len(B1)), integral)
    error_before = np.zeros(nights)
    noise = loop.noise * rng.standard_normal((rows, nights))
    command, speed = np.empty((rows, nights)), np.empty((rows, nights))
    for k in range(rows):
        speed[k] = K * x[-1] + noise[k]
        error = setpoint[k] - speed[k]
        integral = integral + loop.Kp * H / (2 * loop.Ti) * (error + error_before)
        command[k] = loop.Kp * error + integral
        error_before = error
        past = [command[k], *past[:-1]]
        x = A1 @ x + np.outer(B1, past[d + 1])
        x = A2 @ x + np.outer(B2, past[d])
    return command, speed


def setpoints(
    rng: np.random.Generator, rows: int, nights: int, sizes: tuple[float, float], holds: tuple[float, float]
) -> np.ndarray:
    """(rows, nights): moves up and down around 600 of a size that varies from night to night, held for a while, s."""
    r = np.full((rows, nights), 600.0)
    for night in range(nights):
        size = math.exp(rng.uniform(*np.log(sizes)))
        hold = math.exp(rng.uniform(*np.log(holds)))
        at, up = 3.0 + rng.uniform(0, 5), False
        while (row := round(at / H)) < rows:
            up = not up
            r[row:, night] = 600.0 + (size * rng.uniform(0.7, 1.3) if up else 0.0)
            at += hold * rng.uniform(0.6, 1.6)
    return r
