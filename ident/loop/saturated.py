"""A digital loop with a limited command, as a processor runs it: sample by sample, with anti-windup.

Order of a step: read the speed, error, command v = P + I + D, u = limited v, integral updated, plant moved. Linear
loops have faster ways (`simulate`); here the limits make each step depend on the last.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from ident.loop.settings import PidSettings
from ident.loop.simulate import zero_order
from ident.plants.steps import Lagged

Floats = NDArray[np.float64]
AntiWindup = Literal["none", "tracking", "conditional"]


@dataclass(frozen=True, slots=True)
class Limited:
    """What stands between a controller and an ideal loop.

    low, high     of the command, as changes from where it rests
    anti_windup   none; tracking: I += h/Tt (u - v); conditional: I holds while the limit is reached and the error
                  pushes further (Astrom and Hagglund, Advanced PID Control, 2006)
    tracking_s    Tt; None: Ti for a PI, sqrt(Ti Td) for a PID
    resolution    of the measured speed, speed unit: it is rounded to whole steps of this; 0: none
    noise         (n,) added to the measured speed, or None
    """

    low: float = -np.inf
    high: float = np.inf
    anti_windup: AntiWindup = "tracking"
    tracking_s: float | None = None
    resolution: float = 0.0
    noise: Floats | None = None


@dataclass(frozen=True, slots=True, eq=False)
class LimitedTrace:
    """(n,) each: speed, and the command as the limits leave it; at_limit  share of the samples at a limit."""

    time: Floats
    speed: Floats
    command: Floats
    at_limit: float


def run_limited(
    plant: Lagged, settings: PidSettings, period: float, setpoint: Floats, load: Floats, limits: Limited
) -> LimitedTrace:
    """Answer from rest to a setpoint and a load at the plant input, (n,) each, one value per period.

    Integral by forward rule, after the command, as in the usual code; filter and derivative by backward difference.
    """
    delay, num, den = zero_order(plant, period)
    s, n = settings, len(setpoint)
    Tt = limits.tracking_s or (float(np.sqrt(s.Ti * s.Td)) if s.Td > 0 else s.Ti)
    held = np.zeros(n + delay + len(num))
    speeds, commands = np.zeros(n + len(den)), np.zeros(n)
    lag, past, stuck, integral = s.Tf / period, len(den), 0, 0.0
    smooth = np.zeros(3)
    for k in range(n):
        y = speeds[past + k - 1] if k else 0.0
        seen = y + (0.0 if limits.noise is None else limits.noise[k])
        if limits.resolution > 0:
            seen = round(seen / limits.resolution) * limits.resolution
        # y_f + Tf y_f' + (Tf y_f')'/2 Tf = y
        new = (seen + (lag + lag**2) * smooth[0] - lag**2 / 2.0 * smooth[1]) / (1.0 + lag + lag**2 / 2.0)
        slope = (new - smooth[0]) / period
        smooth = np.array([new, smooth[0], smooth[1]])
        error = setpoint[k] - new
        wanted = s.Kp * (s.b * setpoint[k] - new) + integral - s.Kp * s.Td * slope
        command = min(max(wanted, limits.low), limits.high)
        limited = command != wanted
        stuck += limited
        step = s.Kp * period / s.Ti * error
        if limits.anti_windup == "tracking":
            integral += step + period / Tt * (command - wanted)
        elif limits.anti_windup == "none" or not (limited and (wanted - command) * step > 0):
            integral += step
        commands[k] = command
        held[k] = command + load[k]
        # The plant moves: y[k+1] from what was held `delay` samples ago.
        moved = 0.0
        for i, b in enumerate(num):
            j = k + 1 - delay - i
            if j >= 0:
                moved += b * held[j]
        for i, a in enumerate(den[1:], start=1):
            moved -= a * speeds[past + k - i]
        speeds[past + k] = moved
    speed = np.concatenate([[0.0], speeds[past : past + n - 1]])
    return LimitedTrace(np.asarray(period * np.arange(n), np.float64), speed, commands, stuck / n)
