"""Predicted: what the model says the loop will do, before anyone touches the machine."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.loop.simulate import Trace

Floats = NDArray[np.float64]
Series = tuple[float, ...]

DRAWN = 300  # points per curve
STILL = 0.005  # of the step or of the peak: nothing to see after this


@dataclass(frozen=True, slots=True)
class Response:
    """A predicted closed-loop response to a unit step: speed and command changes over time."""

    time_s: Series
    speed: Series
    command: Series


@dataclass(frozen=True, slots=True)
class SetpointStep:
    """Predicted answer to a setpoint step of one speed unit."""

    overshoot_percent: float
    rise_time_s: float | None  # 10 to 90 %
    settling_time_s: float | None  # to stay within 2 %
    iae: float
    peak_command: float  # change of command per speed unit of step, with its sign
    response: Response
    total_variation: float = 0.0  # of the command, command unit per speed unit: all its ups and downs added


@dataclass(frozen=True, slots=True)
class LoadStep:
    """Predicted answer to a load step of one command unit at the plant input."""

    peak_deviation: float  # speed unit per command unit, > 0
    peak_time_s: float
    recovery_time_s: float | None  # back within 5 % of the peak for good
    iae: float
    response: Response
    peak_command: float = 0.0  # change of command per command unit of load, with its sign
    total_variation: float = 0.0  # of the command, per command unit of load


@dataclass(frozen=True, slots=True)
class Predicted:
    """What the model says the loop will do, before anyone touches the machine."""

    setpoint_step: SetpointStep
    load_step: LoadStep


def read_setpoint_step(trace: Trace) -> SetpointStep:
    """The figures of a unit setpoint step; None where the trace ends before they are known."""
    error = 1.0 - trace.speed
    reached = [_first(trace.time, trace.speed, level) for level in (0.1, 0.9)]
    return SetpointStep(
        overshoot_percent=100.0 * max(0.0, float(trace.speed.max()) - 1.0),
        rise_time_s=None if None in reached else float(reached[1] - reached[0]),  # type: ignore[operator]
        settling_time_s=_inside_for_good(trace.time, np.abs(error), 0.02),
        iae=float(np.trapezoid(np.abs(error), trace.time)),
        peak_command=float(trace.command[np.argmax(np.abs(trace.command))]),
        response=_drawn(trace, np.abs(error) > STILL),
        total_variation=_variation(trace),
    )


def read_load_step(trace: Trace) -> LoadStep:
    """The figures of a unit load step; None where the trace ends before they are known."""
    deviation = np.abs(trace.speed)
    top = int(np.argmax(deviation))
    peak = float(deviation[top])
    return LoadStep(
        peak_deviation=peak,
        peak_time_s=float(trace.time[top]),
        recovery_time_s=_inside_for_good(trace.time, deviation, 0.05 * peak),
        iae=float(np.trapezoid(deviation, trace.time)),
        response=_drawn(trace, deviation > STILL * peak),
        peak_command=float(trace.command[np.argmax(np.abs(trace.command))]),
        total_variation=_variation(trace),
    )


def _variation(trace: Trace) -> float:
    # The command starts at 0: its first jump counts.
    return float(np.abs(np.diff(trace.command, prepend=0.0)).sum())


def _first(time: Floats, speed: Floats, level: float) -> float | None:
    above = np.flatnonzero(speed >= level)
    if len(above) == 0:
        return None
    k = int(above[0])
    if k == 0:
        return float(time[0])
    share = (level - speed[k - 1]) / (speed[k] - speed[k - 1])
    return float(time[k - 1] + share * (time[k] - time[k - 1]))


def _inside_for_good(time: Floats, size: Floats, band: float) -> float | None:
    outside = np.flatnonzero(size > band)
    if len(outside) == 0:
        return float(time[0])
    k = int(outside[-1])
    if k == len(size) - 1:
        return None
    share = (size[k] - band) / (size[k] - size[k + 1])
    return float(time[k] + share * (time[k + 1] - time[k]))


def _drawn(trace: Trace, moving: NDArray[np.bool_]) -> Response:
    """At most DRAWN points up to a little after the last movement."""
    still = np.flatnonzero(moving)
    end = min(len(trace.time), int(1.25 * (still[-1] + 1)) + 2) if len(still) else len(trace.time)
    rows = np.unique(np.linspace(0, end - 1, min(DRAWN, end)).round().astype(int))
    return Response(*(tuple(column[rows].tolist()) for column in (trace.time, trace.speed, trace.command)))
