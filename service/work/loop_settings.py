"""What is known of a loop, so that its logs need not repeat it."""

from __future__ import annotations

from typing import Annotated, Any, Literal
from zoneinfo import ZoneInfo

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, model_validator

import ident
from service.work.options import ROLES, Options

LARGEST = 1e9  # beyond it a number is a slip of the pen, and arithmetic with it may overflow

Number = Annotated[float, Field(ge=-LARGEST, le=LARGEST, allow_inf_nan=False)]
Seconds = Annotated[float, Field(ge=0.0, le=86_400.0, allow_inf_nan=False)]
Fraction = Annotated[float, Field(ge=0.0, le=10.0, allow_inf_nan=False)]
Name = Annotated[str, Field(min_length=1, max_length=200)]
Unit = Annotated[str, Field(min_length=1, max_length=30)]


def _not_zero(Kp: float) -> float:
    if abs(Kp) < 1.0 / LARGEST:
        raise ValueError(f"Kp is 0 or so close to it that the controller does nothing: {Kp:g}")
    return Kp


def _known(zone: str) -> str:
    try:
        ZoneInfo(zone)
    except (LookupError, ValueError, OSError) as error:
        raise ValueError(f"there is no time zone {zone!r}; give a name such as Europe/Berlin or UTC") from error
    return zone


class Part(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class Units(Part):
    speed: Unit | None = Field(default=None, description="Of speed and setpoint, where a header has none.")
    command: Unit | None = Field(default=None, description="Of the command, where a header has none.")


class ColumnNames(Part):
    """Headers, or positions counted from 0."""

    time: Name | None = None
    setpoint: Name | None = None
    command: Name | None = None
    speed: Name | None = None


class Controller(Part):
    """u = Kp (b r - y_f + integral of (r - y_f)/Ti - Td dy_f/dt): the ideal form."""

    Kp: Annotated[Number, AfterValidator(_not_zero)] = Field(description="Command unit per speed unit.")
    Ti: float = Field(ge=1e-6, le=LARGEST, allow_inf_nan=False, description="Integral time, s.")
    Td: Seconds = Field(default=0.0, description="Derivative time, s.")
    Tf: Seconds = Field(default=0.0, description="Time constant of the measurement filter, s.")
    b: Number = Field(default=1.0, description="Setpoint weight on the proportional part.")


class CommandLimits(Part):
    low: Number
    high: Number

    @model_validator(mode="after")
    def _ordered(self) -> CommandLimits:
        if not self.low < self.high:
            raise ValueError("low must be below high")
        return self


class Defaults(Part):
    """What is asked of an analysis where the log's own address does not say."""

    model: Literal["fopdt", "sopdt", "arx", "auto"] = "auto"
    Ms: float = Field(default=1.6, gt=1.0, le=5.0, allow_inf_nan=False)
    form: Literal["pi", "pid"] = "pi"
    goal: Literal["integral", "load", "setpoint"] = "integral"


class Practical(Part):
    """Least changes that count as a move, as fractions of the baseline's values."""

    K: Fraction = Field(default=0.10, description="Of K.")
    T: Fraction = Field(default=0.15, description="Of T.")
    K_per_T: Fraction = Field(default=0.15, description="Of K/T.")
    L: Fraction = Field(default=0.20, description="Of L; the larger of this and L_of_sum counts.")
    L_of_sum: Fraction = Field(default=0.05, description="Of T + L.")


class Watch(Part):
    """When a loop is said to have moved."""

    significance: float = Field(
        default=0.0027, ge=1e-9, le=0.1, allow_inf_nan=False, description="False alarms per unchanged night."
    )
    practical: Practical = Practical()


class LoopSettings(Part):
    """Every field may be left out; one that is not known is refused."""

    units: Units = Units()
    columns: ColumnNames = ColumnNames()
    zone: Annotated[str, Field(min_length=1, max_length=100), AfterValidator(_known)] | None = Field(
        default=None, description="Time zone of stamps without offset, such as Europe/Berlin."
    )
    date_order: Literal["dmy", "mdy", "ymd"] | None = None
    counts_per_rev: float | None = Field(default=None, gt=0.0, le=LARGEST, allow_inf_nan=False)
    installed: Controller | None = Field(default=None, description="The settings in the machine.")
    period: Seconds | None = Field(
        default=None, description="Of the controller, s; 0: analogue; null: as each log shows, else its sample time."
    )
    command_limits: CommandLimits | None = Field(default=None, description="In the command's unit.")
    defaults: Defaults = Defaults()
    watch: Watch = Watch()

    def options(self, given: Options) -> Options:
        """The options of one log of this loop: what came with it, and the loop's for the rest."""
        own: dict[str, Any] = {
            "speed_unit": self.units.speed,
            "command_unit": self.units.command,
            "zone": self.zone,
            "date_order": self.date_order,
            "counts_per_rev": self.counts_per_rev,
            "period": self.period,
            "installed": None if self.installed is None else ",".join(map(repr, self.installed.model_dump().values())),
            "command_limits": self.command_limits and f"{self.command_limits.low!r},{self.command_limits.high!r}",
            **{role: getattr(self.columns, role) for role in ROLES},
            **self.defaults.model_dump(),
        }
        told = {name: value for name, value in given if name in given.model_fields_set}
        return Options(**{**own, **told})

    @property
    def controller(self) -> ident.PidSettings | None:
        return None if self.installed is None else ident.PidSettings(**self.installed.model_dump())
