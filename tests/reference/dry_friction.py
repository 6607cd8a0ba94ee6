"""A motor with dry friction, solved exactly: the truth that fits with friction are tested against.

T dy/dt = K (u(t - L) - F(y)) - y, F = forward above 0, -backward below; at standstill the motor stays while
-backward <= u <= forward (Coulomb's law; Armstrong-Hélouvry, Dupont and Canudas de Wit 1994, Automatica 30, 1083-1138).
Between changes of the command and of the direction the speed is one exponential, so every crossing has a closed form.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def respond(u: Floats, h: float, K: float, T: float, L: float, forward: float, backward: float) -> Floats:
    """(n,) speed at the samples, K > 0, from standstill; u[0] held before the first row."""
    n = len(u)
    moves = [(k * h + L, float(u[k])) for k in range(1, n) if u[k] != u[k - 1]]
    speed = np.empty(n)
    y, t, held, upcoming = 0.0, 0.0, float(u[0]), 0
    for k in range(n):
        end = k * h
        while upcoming < len(moves) and moves[upcoming][0] <= end:
            at, value = moves[upcoming]
            y, t, held, upcoming = _run(y, at - t, held, K, T, forward, backward), at, value, upcoming + 1
        y, t = _run(y, end - t, held, K, T, forward, backward), end
        speed[k] = y
    return speed


def _run(y: float, duration: float, u: float, K: float, T: float, forward: float, backward: float) -> float:
    """The speed after `duration` s of a held command."""
    while duration > 0.0:
        if y == 0.0 and -backward <= u <= forward:
            return 0.0
        sign = math.copysign(1.0, y) if y != 0.0 else (1.0 if u > forward else -1.0)
        final = K * (u - (forward if sign > 0 else -backward))
        ahead = final + (y - final) * math.exp(-duration / T)
        if ahead * sign > 0.0:
            return ahead
        # It reaches standstill on the way: (y - final) exp(-t/T) = -final.
        duration -= T * math.log((y - final) / -final) if final != 0.0 else duration
        y = 0.0
    return y
