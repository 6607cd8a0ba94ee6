"""A digital PID as textbooks write it, around a FOPDT, simulated row by row without the package under test.

Åström and Wittenmark, Computer-Controlled Systems, chapter 8: integral by backward, forward or trapezoidal sum,
derivative with a first-order filter by backward difference, setpoint weight, anti-windup by holding the integral at a
limit. The plant is the exact answer of x' = (K u(t - L) - x)/T to the held command.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from tests.reference.held_fopdt import coefficients


@dataclass(frozen=True)
class Pid:
    """Kp, Ti, Td, Tf of the derivative; b weighs the setpoint in the proportional part, c in the derivative."""

    Kp: float
    Ti: float
    Td: float = 0.0
    Tf: float = 0.0
    b: float = 1.0
    c: float = 0.0
    rule: str = "trapezoidal"
    late: int = 0  # rows from the speed to the command
    held: int = 1  # rows of one period
    low: float = -math.inf
    high: float = math.inf
    quantum: float = 0.0
    speed_filter: float = 0.0  # s, first order, backward difference, on the speed
    ramp: float = math.inf  # speed unit per s
    lag: float = 0.0  # s, on the setpoint


@dataclass(frozen=True)
class Motor:
    K: float = 14.6
    T: float = 1.83
    L: float = 0.37
    h: float = 0.1
    noise: float = 2.0


def run(
    pid: Pid, motor: Motor, setpoint: np.ndarray, seed: int, by_hand: np.ndarray | None = None, load: float = 0.0
) -> tuple[np.ndarray, np.ndarray]:
    """(command, speed) at the rows, from rest at the first setpoint.

    by_hand  (n,): the command given in manual, NaN in automatic, which takes over without a bump
    load     standard deviation of a slow load (10 s) at the plant input
    """
    rng = np.random.default_rng(seed)
    n, h = len(setpoint), motor.h
    d, a, b0, b1 = coefficients(motor.K, motor.T, motor.L, h)
    period = h * pid.held
    forget = math.exp(-h / 10.0)
    rest = setpoint[0] / motor.K
    u, y = np.full(n, rest), np.empty(n)
    x, push, out = setpoint[0], 0.0, rest
    integral, derivative, before, filtered, seen = rest, 0.0, None, setpoint[0], setpoint[0]
    proportional = pid.Kp * (pid.b - 1.0) * setpoint[0]
    integral -= proportional
    for k in range(n):
        y[k] = x + motor.noise * rng.standard_normal()
        if k % pid.held == 0:
            now = max(k - pid.late, 0)
            r, speed = setpoint[now], y[now]
            seen += max(-pid.ramp * period, min(pid.ramp * period, r - seen))
            if pid.lag:
                seen = (pid.lag * before[2] + period * r) / (pid.lag + period) if before else r
            share = period / (pid.speed_filter + period)
            filtered = filtered + share * (speed - filtered) if before else speed
            e, slope = seen - filtered, pid.c * seen - filtered
            last_e, last_slope = (before[0], before[1]) if before else (e, slope)
            derivative = (pid.Tf * derivative + pid.Kp * pid.Td * (slope - last_slope)) / (pid.Tf + period)
            sums = {"backward": e, "forward": last_e, "trapezoidal": (e + last_e) / 2.0}
            step = pid.Kp * period / pid.Ti * sums[pid.rule] if before else 0.0
            rest_of_law = pid.Kp * (pid.b * seen - filtered) + derivative
            wanted = rest_of_law + integral + step
            out = min(max(wanted, pid.low), pid.high)
            if out == wanted:
                integral += step
            if pid.quantum:
                out = round(out / pid.quantum) * pid.quantum
            if by_hand is not None and not np.isnan(by_hand[k]):
                out = by_hand[k]
                integral = out - rest_of_law
            before = (e, slope, seen)
        u[k] = out
        push = forget * push + load * math.sqrt(1.0 - forget**2) * rng.standard_normal() if load else 0.0
        older = u[k - d - 1] if k > d else rest
        x = a * x + b0 * ((u[k - d] if k >= d else rest) + push) + b1 * (older + push)
    return u, y


def steps(rows: int, moves: tuple[tuple[int, float], ...]) -> np.ndarray:
    """A setpoint that takes a value from each row on."""
    r = np.empty(rows)
    for at, value in moves:
        r[at:] = value
    return r
