"""Setpoint weight: as much of a setpoint step as the proportional part may see without overshooting."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused
from ident.findings import Finding
from ident.loop import PidSettings
from ident.loop.simulate import Trace
from ident.plants.steps import Lagged
from ident.tune.predict import Rehearsal

OVERSHOOT = 5.0  # %
WEIGHTS = np.round(np.arange(20, -1, -1) * 0.05, 2)
RAMPS = (1.0, 1.5, 2.0, 3.0, 4.0, 6.0, 8.0, 12.0, 16.0, 24.0, 32.0)


def choose_setpoint_weight(
    plant: Lagged,
    settings: PidSettings,
    *,
    period: float = 0.0,
    compute_delay: float = 0.0,
    overshoot_percent: float = OVERSHOOT,
) -> tuple[PidSettings, Finding | None]:
    """The same settings with the largest b (multiple of 0.05, at most 1) whose predicted overshoot is allowed.

    Where even b = 0 overshoots more, b = 0 and a finding `setpoint-ramp-advised` with the shortest of a few
    ramp times that does not.
    """
    rehearsal = Rehearsal(plant, settings, period, compute_delay)
    rehearsal.check()
    b, finding = weight_of(rehearsal, overshoot_percent)
    return replace(settings, b=b), finding


def weight_of(rehearsal: Rehearsal, overshoot_percent: float = OVERSHOOT) -> tuple[float, Finding | None]:
    """The same b and finding, of a loop simulated already."""
    for b in WEIGHTS:
        if _overshoot(rehearsal.setpoint(float(b)).speed) <= overshoot_percent:
            return float(b), None
    without = rehearsal.setpoint(0.0)
    ramp = _ramp_time(without, overshoot_percent)
    return 0.0, Finding(
        "setpoint-ramp-advised",
        "info",
        f"Even with setpoint weight 0 a setpoint step overshoots by {_overshoot(without.speed):.0f} %: "
        f"move the setpoint over a ramp of at least {ramp:.3g} s instead of a step.",
        {"overshoot_percent": _overshoot(without.speed), "ramp_s": ramp},
    )


def _overshoot(speed: NDArray[np.float64]) -> float:
    return 100.0 * max(0.0, float(speed.max()) - 1.0)


def _ramp_time(step: Trace, allowed: float) -> float:
    """A ramp is the step averaged over its duration; durations are multiples of the step's time to its peak."""
    time, peak_time = step.time, float(step.time[np.argmax(step.speed)])
    area = np.concatenate([[0.0], np.cumsum((step.speed[1:] + step.speed[:-1]) / 2 * np.diff(time))])
    for multiple in RAMPS:
        ramp = multiple * peak_time
        # Beyond the trace the speed has settled at 1.
        until = np.append(time, time[-1] + ramp)
        grown = np.append(area, area[-1] + ramp)
        at = np.linspace(0.0, until[-1], 20_001)
        speed = (np.interp(at, until, grown) - np.interp(at - ramp, until, grown, left=0.0)) / ramp
        if _overshoot(speed) <= allowed:
            return ramp
    raise Refused("loop-unstable", "The loop is too close to unstable for any setpoint change.")
