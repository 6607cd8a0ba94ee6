"""Motor: a permanent-magnet DC motor from its nameplate, voltage to speed."""

from __future__ import annotations

import math
from dataclasses import dataclass

from ident.errors import Refused
from ident.plants.fopdt import Fopdt
from ident.plants.sopdt import Sopdt, UnderdampedSopdt


@dataclass(frozen=True, slots=True)
class Motor:
    """w(s)/V(s) = Kt/((J s + b)(L s + R) + Kt Ke), rad/s per V.

    Kt  Nm/A;  Ke  V s/rad;  R  ohm;  L  H, >= 0;  J  kg m^2;  b  Nm s/rad, >= 0
    Raises Refused nameplate-out-of-range. (Krishnan, Electric Motor Drives, 2001, chapter 2.)
    """

    Kt: float
    Ke: float
    R: float
    L: float
    J: float
    b: float = 0.0

    def __post_init__(self) -> None:
        positive = (self.Kt, self.Ke, self.R, self.J)
        if not (all(0.0 < v < math.inf for v in positive) and all(0.0 <= v < math.inf for v in (self.L, self.b))):
            raise Refused(
                "nameplate-out-of-range",
                "A motor needs Kt, Ke, R and J above 0, L and b 0 or more, in SI units; "
                f"got {self.Kt}, {self.Ke}, {self.R}, {self.J}, {self.L}, {self.b}.",
            )

    @property
    def gain(self) -> float:
        """Static gain, rad/s per V."""
        return self.Kt / (self.R * self.b + self.Kt * self.Ke)

    @property
    def tau(self) -> float:
        """Time constant with the inductance left out, s."""
        return self.R * self.J / (self.R * self.b + self.Kt * self.Ke)

    @property
    def tau_m(self) -> float:
        """Mechanical time constant without friction, s."""
        return self.R * self.J / (self.Ke * self.Kt)

    @property
    def tau_e(self) -> float:
        """Electrical time constant, s."""
        return self.L / self.R

    @property
    def rpm_per_volt(self) -> float:
        """Speed constant 30/(pi Ke)."""
        return 30.0 / (math.pi * self.Ke)

    def stall(self, voltage: float) -> tuple[float, float]:
        """(torque in Nm, current in A) with the shaft held, voltage in V."""
        return self.Kt * voltage / self.R, voltage / self.R

    def plant(self) -> Fopdt | Sopdt | UnderdampedSopdt:
        """The transfer function as a plant without dead time, rad/s per V."""
        below = self.R * self.b + self.Kt * self.Ke
        P, S = self.J * self.L / below, (self.J * self.R + self.b * self.L) / below
        if P == 0.0:
            return Fopdt(self.gain, S, 0.0)
        if S * S < 4.0 * P:
            return UnderdampedSopdt(self.gain, 1.0 / math.sqrt(P), S / (2.0 * math.sqrt(P)), 0.0)
        slow = (S + math.sqrt(S * S - 4.0 * P)) / 2.0
        return Sopdt(self.gain, slow, min(P / slow, slow), 0.0)


def from_nameplate(
    *, voltage: float, no_load_rpm: float, no_load_current: float, R: float, L: float, J: float
) -> Motor:
    """A motor from its no-load row: voltage in V, speed in rpm, current in A; R in ohm, L in H, J in kg m^2.

    Ke = Kt = (voltage - R current)/w0, and b from the torque that the no-load current makes.
    Raises Refused nameplate-out-of-range.
    """
    w0 = no_load_rpm * math.pi / 30.0
    back = voltage - R * no_load_current
    if not (0.0 < w0 < math.inf and back > 0.0 and no_load_current >= 0.0):
        raise Refused(
            "nameplate-out-of-range",
            "No-load speed must be above 0, and the no-load current times R below the voltage; "
            f"got {no_load_rpm} rpm, {no_load_current} A, {voltage} V, {R} ohm.",
        )
    K = back / w0
    return Motor(K, K, R, L, J, K * no_load_current / w0)
