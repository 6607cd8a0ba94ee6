"""Realising: how a tuning is to be carried out, and a card to be judged; the same over HTTP and in a worker."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

import ident
from service.work.options import Options

Positive = Annotated[float, Field(gt=0.0, le=1e15, allow_inf_nan=False)]
Span = Annotated[float | None, Field(default=None, gt=0.0, le=1e15, allow_inf_nan=False)]
Tolerance = Annotated[float, Field(ge=0.0, lt=0.5, allow_inf_nan=False)]
Series = Literal["E3", "E6", "E12", "E24", "E48", "E96", "E192"]


class Digital(BaseModel):
    """A panel or a processor: forms, percent of span, coefficients, whole numbers."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    kind: Literal["digital"]
    speed_span: Span = Field(default=None, description="Of the controller's speed scale, in the log's unit.")
    command_span: Span = Field(default=None, description="Of its command scale, in the log's unit.")
    filter_on: Literal["speed", "derivative"] = Field(default="speed", description="Where its filter stands.")
    N: Annotated[float | None, Field(gt=0.0, le=1e6, allow_inf_nan=False)] = Field(
        default=None, description="Filter on the derivative: Td/N; left out: the proposal's Tf."
    )
    bits: int | None = Field(default=None, ge=8, le=32, description="Word length for whole-number coefficients.")


class Solder(BaseModel):
    """What a card is on, and what there is to solder."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    speed_volts: Positive = Field(default=1.0, description="V on the card per unit of speed.")
    command_volts: Positive = Field(default=1.0, description="V on the card per unit of command.")
    R_series: Series = "E24"
    C_series: Series = "E6"
    R_low: Positive = Field(default=4.7e3, description="Smallest resistor, ohm (Rd apart).")
    R_high: Positive = Field(default=1e6, description="Largest resistor, ohm.")
    Rd_low: Positive = Field(default=470.0, description="Smallest damping resistor, ohm.")
    C_low: Positive = Field(default=1e-9, description="Smallest capacitor, F.")
    C_high: Positive = Field(default=4.7e-6, description="Largest capacitor, F.")
    R_tolerance: Tolerance = 0.01
    C_tolerance: Tolerance = 0.05

    @property
    def scale(self) -> ident.CardScale:
        return ident.CardScale(self.speed_volts, self.command_volts)

    @property
    def limits(self) -> ident.Limits:
        return ident.Limits(self.R_series, self.C_series, self.R_low, self.R_high, self.Rd_low, self.C_low, self.C_high)


class Analogue(Solder):
    """An op-amp card, chosen from parts that can be bought."""

    kind: Literal["analogue"]
    leak: Literal["none", "C2", "both"] = Field(default="none", description="Where a leak resistor lies.")
    Rl: Positive | None = Field(default=None, description="The leak, ohm.")


Realising = Annotated[Digital | Analogue, Field(discriminator="kind")]


class CardParts(BaseModel):
    """Parts as found: ohm and F."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    R1: Positive
    R2: Positive
    C2: Positive
    Rd: Positive | None = None
    C1: Positive | None = None
    Rl: Positive | None = None
    leak: Literal["none", "C2", "both"] = "none"
    Ra: Positive = 10e3
    Rb: Positive = 10e3


class GivenPlant(BaseModel):
    """K exp(-L s)/((T s + 1)(T2 s + 1)), s; T2 left out: first order."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    K: float = Field(allow_inf_nan=False, description="Speed unit per command unit, not 0.")
    T: Positive
    L: float = Field(ge=0.0, le=1e15, allow_inf_nan=False)
    T2: Positive | None = None

    def model(self) -> ident.Fopdt | ident.Sopdt:
        if self.T2 is None:
            return ident.Fopdt(self.K, self.T, self.L)
        return ident.Sopdt(self.K, max(self.T, self.T2), min(self.T, self.T2), self.L)


class Card(Solder):
    """A card on a plant: the plant as given, or that of a kept report; with Ms, the change that reaches it."""

    parts: CardParts
    plant: GivenPlant | None = None
    report_id: str | None = Field(default=None, max_length=100)
    Ms: float | None = Field(default=None, gt=1.0, le=5.0, allow_inf_nan=False, description="Target to reach.")


class CardOptions(Options):
    """What travels to a worker with a kept report, or with nothing where the plant is given."""

    card: Card
