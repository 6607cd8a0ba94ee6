"""Limited: a setpoint step as large as the log's own, predicted with the command's limits, sampling and noise."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.findings import Finding
from ident.loop import PidSettings
from ident.loop.saturated import Limited, run_limited
from ident.loop.simulate import Trace
from ident.plants.steps import Lagged
from ident.tune.predicted import SetpointStep, read_setpoint_step

MOST_SAMPLES = 4000
LONG = 12.0  # times T + L + Ti: rows enough for a loop within any sensible target to settle


@dataclass(frozen=True, slots=True)
class Move:
    """A setpoint step: size in speed units, and the room that the command has from where it rests, command units.

    low <= 0 <= high; -inf, inf: no limit
    """

    size: float
    low: float
    high: float


@dataclass(frozen=True, slots=True)
class LimitedOutcome:
    """What a setpoint step of `size` does within the limits.

    setpoint_step  figures per speed unit of the step, anti-windup by tracking, the log's noise on the measured speed
    at_limit       share of the shown time that the command stands at a limit
    largest_step   in the same direction, speed units, that stays within the limits; None: any
    """

    size: float
    setpoint_step: SetpointStep
    at_limit: float
    largest_step: float | None


def limited_outcome(
    plant: Lagged, settings: PidSettings, free: SetpointStep, move: Move, *, period: float, noise: float, seed: int
) -> LimitedOutcome | None:
    """The step within the limits; None without limits or for an analogue controller.

    free  the same step without limits;  noise  std of the measured speed, speed units, white, drawn by `seed`

    Unless a limit is met the noise is left out: the figures are then those of `free`.
    """
    if period <= 0.0 or not np.isfinite([move.low, move.high]).any() or move.size == 0.0:
        return None
    peak = free.peak_command * move.size
    room = move.high if peak > 0.0 else move.low
    largest = abs(room / free.peak_command) if np.isfinite(room) and free.peak_command != 0.0 else None
    if move.low <= peak <= move.high:
        return LimitedOutcome(move.size, free, 0.0, largest)
    lags = plant.T if hasattr(plant, "T") else plant.S
    samples = min(int(LONG * (lags + plant.L + settings.Ti) / period) + 2, MOST_SAMPLES)
    drawn = noise * np.random.default_rng(seed).standard_normal(samples)
    limits = Limited(move.low, move.high, noise=drawn)
    ran = run_limited(plant, settings, period, np.full(samples, move.size), np.zeros(samples), limits)
    trace = Trace(ran.time, ran.speed / move.size, ran.command / move.size)
    return LimitedOutcome(move.size, read_setpoint_step(trace), float(ran.at_limit), largest)


def saturates(outcome: LimitedOutcome | None, unit: str) -> tuple[Finding, ...]:
    """A finding where the command meets a limit."""
    if outcome is None or outcome.at_limit == 0.0:
        return ()
    within = "" if outcome.largest_step is None else f" Steps up to {outcome.largest_step:.3g} stay within the limits."
    step = outcome.setpoint_step
    return (
        Finding(
            "command-saturates",
            "warning",
            f"A setpoint step of {abs(outcome.size):.3g} {unit or 'speed units'}, the largest in this log, drives the "
            f"command into its limit: predicted with it the overshoot is {step.overshoot_percent:.0f} %, provided that "
            f"the controller stops its integral there (anti-windup).{within}",
            {
                "size": outcome.size,
                "largest_step": outcome.largest_step,
                "overshoot_percent": step.overshoot_percent,
                "rise_time_s": step.rise_time_s,
            },
        ),
    )
