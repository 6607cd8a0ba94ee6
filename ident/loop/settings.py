"""PidSettings: a controller in ideal (ISA standard) form."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ident.errors import Refused


@dataclass(frozen=True, slots=True)
class PidSettings:
    """u = Kp (b r - y_f + integral of (r - y_f)/Ti - Td dy_f/dt), y_f = F y, F = 1/(1 + s Tf + (s Tf)^2/2).

    Kp  command unit per speed unit, the sign of the plant's gain, not 0
    Ti  s, > 0 (inf: no integral action);  Td  s, >= 0;  Tf  s, >= 0 (0: no filter)
    b   setpoint weight on the proportional part
    Raises Refused settings-out-of-range.
    """

    Kp: float
    Ti: float
    Td: float = 0.0
    Tf: float = 0.0
    b: float = 1.0

    def __post_init__(self) -> None:
        finite = np.isfinite([self.Kp, self.Td, self.Tf, self.b]).all()
        if not (finite and self.Kp != 0 and self.Ti > 0 and self.Td >= 0 and self.Tf >= 0):
            raise Refused(
                "settings-out-of-range",
                "A controller needs Kp finite and not 0, Ti > 0, Td >= 0, Tf >= 0; "
                f"got {self.Kp}, {self.Ti}, {self.Td}, {self.Tf}, b = {self.b}.",
            )

    @property
    def ki(self) -> float:
        """abs(Kp/Ti), command unit per speed unit and second."""
        return abs(self.Kp / self.Ti)

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """C(jw) F(jw), the feedback path, for w in rad/s > 0."""
        s = 1j * np.asarray(w, dtype=np.float64)
        controller = self.Kp * (1.0 + 1.0 / (s * self.Ti) + s * self.Td)
        return np.asarray(controller / (1.0 + s * self.Tf + (s * self.Tf) ** 2 / 2.0), dtype=np.complex128)
