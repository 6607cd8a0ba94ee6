"""Network: an op-amp controller card as its parts, and what they make of a speed error.

Error amplifier Rb/Ra, then an inverting amplifier: input R1 parallel with (Rd + C1), feedback R2 + C2 in series, and
an optional leak Rl across C2 or across both. Without Rd and C1 it is a PI card. The op-amps are taken as ideal.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ident.errors import Refused
from ident.loop import PidSettings

Leak = Literal["none", "C2", "both"]
PARTS = ("R1", "Rd", "C1", "R2", "C2", "Rl", "Ra", "Rb")


@dataclass(frozen=True, slots=True)
class Parts:
    """Resistors in ohm, capacitors in F, all above 0; Rd and C1 both or neither; Rl across C2 or across "both"."""

    R1: float
    R2: float
    C2: float
    Rd: float | None = None
    C1: float | None = None
    Rl: float | None = None
    leak: Leak = "none"
    Ra: float = 10e3
    Rb: float = 10e3

    def __post_init__(self) -> None:
        given = [v for v in (getattr(self, name) for name in PARTS) if v is not None]
        if not all(0.0 < v < math.inf for v in given):
            raise Refused("parts-out-of-range", "Every part is finite and above 0: resistors in ohm, capacitors in F.")
        if (self.Rd is None) != (self.C1 is None):
            raise Refused("parts-incomplete", "Rd and C1 stand in series: give both, or neither for a PI card.")
        if (self.Rl is None) != (self.leak == "none") or self.leak not in ("none", "C2", "both"):
            raise Refused("parts-incomplete", 'Give the leak Rl together with where it lies: leak "C2" or "both".')

    @property
    def given(self) -> dict[str, float]:
        """The parts that are there, by name."""
        return {name: getattr(self, name) for name in PARTS if getattr(self, name) is not None}


@dataclass(frozen=True, slots=True)
class CardScale:
    """Volts on the card per unit of the log.

    speed    V per speed unit, of the tachometer or its divider;  command  V per command unit;  both > 0
    """

    speed: float = 1.0
    command: float = 1.0

    def __post_init__(self) -> None:
        if not (0.0 < self.speed < math.inf and 0.0 < self.command < math.inf):
            raise Refused(
                "card-scale-out-of-range",
                "The card's volts per unit of speed and of command are finite and above 0.",
            )

    @property
    def gain(self) -> float:
        """Command unit per speed unit of a card that amplifies by 1 V/V."""
        return self.speed / self.command


def response(w: NDArray[np.float64], values: Mapping[str, Any], leak: Leak) -> NDArray[np.complex128]:
    """The whole card's gain along w, rad/s, in V/V, inversions left out.

    values  of the parts by name, numbers or arrays that broadcast against w
    """
    s = 1j * w
    admittance = 1.0 / values["R1"]
    if "C1" in values:
        admittance = admittance + s * values["C1"] / (1.0 + s * values["Rd"] * values["C1"])
    store = s * values["C2"] + (1.0 / values["Rl"] if leak == "C2" else 0.0)
    feedback = values["R2"] + 1.0 / store
    if leak == "both":
        feedback = feedback * values["Rl"] / (feedback + values["Rl"])
    return np.asarray(values["Rb"] / values["Ra"] * feedback * admittance, dtype=np.complex128)


@dataclass(frozen=True, slots=True)
class Card:
    """A card as a controller, in the units of the log; sign: of the plant's gain, taken care of by the wiring."""

    parts: Parts
    scale: CardScale = CardScale()
    sign: float = 1.0

    @property
    def gain(self) -> float:
        """Kc of the series form, command unit per speed unit."""
        p = self.parts
        return self.sign * p.Rb / p.Ra * p.R2 / p.R1 * self.scale.gain

    @property
    def tauI(self) -> float:
        return self.parts.R2 * self.parts.C2

    @property
    def tauD(self) -> float:
        p = self.parts
        return 0.0 if p.C1 is None or p.Rd is None else (p.R1 + p.Rd) * p.C1

    @property
    def filter_time(self) -> float:
        p = self.parts
        return 0.0 if p.C1 is None or p.Rd is None else p.Rd * p.C1

    @property
    def Ti(self) -> float:
        return self.tauI

    @property
    def Td(self) -> float:
        return self.tauD

    @property
    def Tf(self) -> float:
        return self.filter_time

    @property
    def settings(self) -> PidSettings:
        """The ideal form, the network's own filter pole left out of Kp, Ti, Td and given as Tf."""
        factor = 1.0 + self.tauD / self.tauI
        return PidSettings(self.gain * factor, self.tauI * factor, self.tauD / factor, self.filter_time)

    @property
    def low_gain(self) -> float | None:
        """V/V at 0 rad/s; None without a leak: it integrates for ever."""
        p = self.parts
        if p.Rl is None:
            return None
        return p.Rb / p.Ra * (p.Rl if p.leak == "both" else p.R2 + p.Rl) / p.R1

    @property
    def high_gain(self) -> float:
        """V/V at high frequencies."""
        p = self.parts
        feedback = p.R2 * p.Rl / (p.R2 + p.Rl) if p.leak == "both" and p.Rl is not None else p.R2
        return p.Rb / p.Ra * feedback * (1.0 / p.R1 + (0.0 if p.Rd is None else 1.0 / p.Rd))

    @property
    def corners_hz(self) -> dict[str, float]:
        """Corner frequencies, Hz: integrating, differentiating, filter, leak, those that are there."""
        p = self.parts
        times = {"integrating": self.tauI, "differentiating": self.tauD, "filter": self.filter_time}
        if p.Rl is not None:
            times["leak"] = (p.Rl if p.leak == "C2" else p.R2 + p.Rl) * p.C2
        return {name: 1.0 / (2.0 * math.pi * t) for name, t in times.items() if t > 0.0}

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """From speed to minus the command, w in rad/s."""
        volts = response(np.asarray(w, dtype=np.float64), self.parts.given, self.parts.leak)
        return np.asarray(self.sign * self.scale.gain * volts, dtype=np.complex128)
