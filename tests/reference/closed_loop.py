"""A PI or PID loop around a FOPDT with a slow load disturbance, simulated step by step: logs for Monte Carlo checks."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

SUBSTEPS = 5  # per period: the disturbance moves between samples too; the dead time is a whole number of them


@dataclass(frozen=True)
class Loop:
    """Plant K, T, L; period h s; rows; PI in the trapezoidal reading; noise and load standard deviations.

    Td  s, of a derivative of the measured speed by backward difference through a lag of Td/10 or a period
    """

    K: float
    T: float
    L: float
    h: float
    rows: int
    Kp: float
    Ti: float
    noise: float
    load: float
    load_time: float
    setpoint_half_period: float = 10.0
    Td: float = 0.0


def simulate(loop: Loop, runs: int, seed: int) -> Iterator[tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]]:
    """Time, command, speed, setpoint of each run; the load is an Ornstein-Uhlenbeck process at the plant input."""
    rng = np.random.default_rng(seed)
    step = loop.h / SUBSTEPS
    delay = round(loop.L / step)
    assert abs(delay * step - loop.L) < 1e-9
    a, forget = np.exp(-step / loop.T), np.exp(-step / loop.load_time)
    time = loop.h * np.arange(loop.rows)
    setpoint = np.where(time // loop.setpoint_half_period % 2 == 0, 0.0, 1.0)
    speed, integral, before, command = (np.zeros(runs) for _ in range(4))
    pipe = np.zeros((delay + 1, runs))
    load = loop.load * rng.standard_normal(runs)
    U, Y = np.empty((loop.rows, runs)), np.empty((loop.rows, runs))
    slope, last = np.zeros(runs), np.zeros(runs)
    smooth = np.exp(-loop.h / max(loop.Td / 10.0, loop.h))
    at = 0
    for k in range(loop.rows):
        Y[k] = speed + loop.noise * rng.standard_normal(runs)
        error = setpoint[k] - Y[k]
        integral += loop.Kp * loop.h / (2.0 * loop.Ti) * (error + before)
        before = error
        slope = smooth * slope + (1.0 - smooth) * (Y[k] - last) / loop.h
        last = Y[k].copy()
        command = loop.Kp * (error - loop.Td * slope) + integral
        U[k] = command
        for _ in range(SUBSTEPS):
            load = forget * load + loop.load * np.sqrt(1.0 - forget**2) * rng.standard_normal(runs)
            pipe[at] = command
            at = (at + 1) % (delay + 1)
            speed = a * speed + (1.0 - a) * loop.K * (pipe[at] + load)
    for run in range(runs):
        yield time, U[:, run], Y[:, run], setpoint
