"""PidSettings: a controller in ideal (ISA standard) form."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray


@dataclass(frozen=True, slots=True)
class PidSettings:
    """u = Kp (b r - y_f + integral of (r - y_f)/Ti - Td dy_f/dt), y_f = F y, F = 1/(1 + s Tf + (s Tf)^2/2).

    Kp  command unit per speed unit, the sign of the plant's gain
    Ti  s, > 0;  Td  s, >= 0;  Tf  s, >= 0 (0: no filter);  b  setpoint weight on the proportional part
    """

    Kp: float
    Ti: float
    Td: float = 0.0
    Tf: float = 0.0
    b: float = 1.0

    @property
    def ki(self) -> float:
        """abs(Kp/Ti), command unit per speed unit and second."""
        return abs(self.Kp / self.Ti)

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """C(jw) F(jw), the feedback path, for w in rad/s > 0."""
        s = 1j * np.asarray(w, dtype=np.float64)
        controller = self.Kp * (1.0 + 1.0 / (s * self.Ti) + s * self.Td)
        response: NDArray[np.complex128] = controller / (1.0 + s * self.Tf + (s * self.Tf) ** 2 / 2.0)
        return response
