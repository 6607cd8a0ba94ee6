"""Predicted: what the model says the loop will do, before anyone touches the machine."""

from __future__ import annotations

from dataclasses import dataclass

Series = tuple[float, ...]


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
    peak_command: float  # change of command per speed unit of step
    response: Response


@dataclass(frozen=True, slots=True)
class LoadStep:
    """Predicted answer to a load step of one command unit at the plant input."""

    peak_deviation: float
    peak_time_s: float
    recovery_time_s: float | None  # back within 5 % of the peak for good
    iae: float
    response: Response


@dataclass(frozen=True, slots=True)
class Predicted:
    """What the model says the loop will do, before anyone touches the machine."""

    setpoint_step: SetpointStep
    load_step: LoadStep
