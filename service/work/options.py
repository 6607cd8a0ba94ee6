"""Options: what may be asked of an analysis, the same over HTTP and on the command line."""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from datetime import datetime
from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError, field_validator

from service.errors import Problem, Value

ROLES = ("time", "setpoint", "command", "speed")


def _column(role: str) -> Any:
    return Field(
        default=None,
        min_length=1,
        max_length=200,
        description=f"Column of the {role}: its header, or its position counted from 0.",
    )


def _unit(role: str) -> Any:
    return Field(
        default=None,
        min_length=1,
        max_length=30,
        description=f"Unit of the {role}, where its header has none.",
    )


def settings_told(told: str) -> tuple[float, ...]:
    """Kp, Ti and, where told, Td, Tf, b. Raises ValueError with what is wrong."""
    found = tuple(float(number) for number in told.split(","))
    if len(found) not in (2, 5) or not all(math.isfinite(number) for number in found):
        raise ValueError("give two or five numbers: Kp,Ti or Kp,Ti,Td,Tf,b")
    if found[0] == 0.0 or found[1] <= 0.0 or min(found[2:4], default=0.0) < 0.0:
        raise ValueError("Kp must not be 0, Ti must be above 0, Td and Tf not below 0")
    return found


def limits_told(told: str) -> tuple[float, float]:
    """(low, high) of "low,high". Raises ValueError with what is wrong."""
    found = [float(number) for number in told.split(",")]
    if len(found) != 2 or not -1e9 <= found[0] < found[1] <= 1e9:
        raise ValueError("give two numbers, low,high, the lower first, such as 0,100")
    return found[0], found[1]


class Options(BaseModel):
    """Every field is optional; a misspelt one is refused, not ignored."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    model: Literal["fopdt", "sopdt", "arx", "auto"] = Field(default="auto", description="Model to fit; auto chooses.")
    Ms: float = Field(
        default=1.6,
        gt=1.0,
        le=5.0,
        allow_inf_nan=False,
        description="Robustness target: max(Ms, Mt) is at most this.",
    )
    form: Literal["pi", "pid"] = Field(default="pi", description="Form of the controller.")
    goal: Literal["integral", "load", "setpoint"] = Field(
        default="integral",
        description="What to be best at: integral action, or a small error after a load or setpoint step.",
    )
    period: float | None = Field(
        default=None,
        ge=0.0,
        le=86_400.0,
        allow_inf_nan=False,
        description="Period of the controller, s; 0 if analogue; unset: as the log shows, else its sample time.",
    )
    installed: str | None = Field(
        default=None,
        max_length=150,
        description="Settings in the machine, to compare the log with: Kp,Ti or Kp,Ti,Td,Tf,b.",
    )
    command_limits: str | None = Field(
        default=None,
        max_length=80,
        description="Limits of the command, low,high, in its unit: a test that is advised stays within them.",
    )
    zone: str | None = Field(
        default=None,
        min_length=1,
        max_length=100,
        description="Time zone of stamps without offset, such as Europe/Berlin.",
    )
    date_order: Literal["dmy", "mdy", "ymd"] | None = Field(
        default=None, description="Order of day, month and year, where the stamps leave it open."
    )
    start: datetime | None = Field(
        default=None,
        description="Time of the first row, for a log of elapsed seconds, such as 2026-03-01T06:00:00Z.",
    )
    counts_per_rev: float | None = Field(
        default=None,
        gt=0.0,
        allow_inf_nan=False,
        description="Encoder counts per revolution, where the speed column counts.",
    )
    speed_unit: str | None = _unit("speed")
    command_unit: str | None = _unit("command")
    time: str | None = _column("time")
    setpoint: str | None = _column("setpoint")
    command: str | None = _column("command")
    speed: str | None = _column("speed")

    @property
    def columns(self) -> dict[str, str | int] | None:
        """{role: header or position} of the columns that were named, None if none was."""
        named = {role: getattr(self, role) for role in ROLES if getattr(self, role) is not None}
        return {role: int(name) if name.isdecimal() else name for role, name in named.items()} or None

    @field_validator("installed")
    @classmethod
    def _checked(cls, told: str | None) -> str | None:
        if told is not None:
            settings_told(told)
        return told

    @field_validator("command_limits")
    @classmethod
    def _ordered(cls, told: str | None) -> str | None:
        if told is not None:
            limits_told(told)
        return told

    def text(self) -> str:
        """JSON of what differs from the defaults: equal for equal options, and still so when options are added."""
        return json.dumps(self.model_dump(mode="json", exclude_defaults=True), sort_keys=True)


def wrong_options(faults: Sequence[Any] | ValidationError) -> Problem:
    """The problem that names every option at fault; `faults` as pydantic lists them."""
    listed = faults.errors() if isinstance(faults, ValidationError) else faults
    evidence: dict[str, Value] = {}
    for fault in listed:
        where = fault.get("loc")
        name = str(where[-1]) if where else "request"
        unknown = fault.get("type") == "extra_forbidden"
        evidence[name] = "there is no such option" if unknown else str(fault.get("msg"))
    told = "; ".join(f"{name}: {said}" for name, said in evidence.items())
    return Problem("invalid-option", f"Correct these options and send the log again. {told}.", evidence)
