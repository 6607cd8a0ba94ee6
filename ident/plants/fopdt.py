"""Fopdt: first-order lag with dead time, K exp(-L s) / (T s + 1)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ident.errors import Refused


@dataclass(frozen=True, slots=True)
class Fopdt:
    """K exp(-L s) / (T s + 1).

    K   static gain, speed unit per command unit, any sign but not 0
    T   time constant, s, > 0
    L   dead time, s, >= 0
    """

    K: float
    T: float
    L: float

    def __post_init__(self) -> None:
        if not (np.isfinite([self.K, self.T, self.L]).all() and self.K != 0 and self.T > 0 and self.L >= 0):
            raise Refused(
                "plant-out-of-range",
                f"A first-order plant needs K finite and not 0, T > 0, L >= 0; got K={self.K}, T={self.T}, L={self.L}.",
            )

    @property
    def static_gain(self) -> float:
        return self.K

    @property
    def dead_time(self) -> float:
        return self.L

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """P(jw) for w in rad/s, any shape."""
        s = 1j * np.asarray(w, dtype=np.float64)
        response: NDArray[np.complex128] = self.K * np.exp(-self.L * s) / (self.T * s + 1.0)
        return response
