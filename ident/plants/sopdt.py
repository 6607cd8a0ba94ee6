"""Sopdt: second-order lag with dead time, as two lags or as an underdamped pair."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ident.errors import Refused


@dataclass(frozen=True, slots=True)
class Sopdt:
    """K exp(-L s) / ((T1 s + 1)(T2 s + 1)).

    K       static gain, speed unit per command unit, any sign but not 0
    T1, T2  time constants, s, T1 >= T2 > 0
    L       dead time, s, >= 0
    """

    K: float
    T1: float
    T2: float
    L: float

    def __post_init__(self) -> None:
        if not (np.isfinite([self.K, self.T1, self.T2, self.L]).all() and self.T1 >= self.T2):
            raise _refused(f"T1 >= T2; got K={self.K}, T1={self.T1}, T2={self.T2}, L={self.L}")
        if not (self.K != 0 and self.T2 > 0 and self.L >= 0):
            raise _refused(f"K not 0, T2 > 0, L >= 0; got K={self.K}, T1={self.T1}, T2={self.T2}, L={self.L}")

    @property
    def static_gain(self) -> float:
        return self.K

    @property
    def dead_time(self) -> float:
        return self.L

    @property
    def S(self) -> float:
        """Sum of the time constants, s."""
        return self.T1 + self.T2

    @property
    def P(self) -> float:
        """Product of the time constants, s^2."""
        return self.T1 * self.T2

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """P(jw) for w in rad/s, any shape."""
        s = 1j * np.asarray(w, dtype=np.float64)
        return np.asarray(self.K * np.exp(-self.L * s) / ((self.T1 * s + 1.0) * (self.T2 * s + 1.0)))


@dataclass(frozen=True, slots=True)
class UnderdampedSopdt:
    """K w0^2 exp(-L s) / (s^2 + 2 zeta w0 s + w0^2).

    K     static gain, speed unit per command unit, any sign but not 0
    w0    natural frequency, rad/s, > 0;  zeta  damping ratio, 0 < zeta < 1
    L     dead time, s, >= 0
    """

    K: float
    w0: float
    zeta: float
    L: float

    def __post_init__(self) -> None:
        if not (np.isfinite([self.K, self.w0, self.zeta, self.L]).all() and self.K != 0 and self.w0 > 0):
            raise _refused(f"K not 0, w0 > 0; got K={self.K}, w0={self.w0}")
        if not (0 < self.zeta < 1 and self.L >= 0):
            raise _refused(f"0 < zeta < 1, L >= 0; got zeta={self.zeta}, L={self.L}")

    @property
    def static_gain(self) -> float:
        return self.K

    @property
    def dead_time(self) -> float:
        return self.L

    @property
    def S(self) -> float:
        """2 zeta/w0, s: what the sum of two time constants would be."""
        return 2.0 * self.zeta / self.w0

    @property
    def P(self) -> float:
        """1/w0^2, s^2: what their product would be."""
        return 1.0 / self.w0**2

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """P(jw) for w in rad/s, any shape."""
        s = 1j * np.asarray(w, dtype=np.float64)
        return np.asarray(self.K * np.exp(-self.L * s) / (self.P * s * s + self.S * s + 1.0))


def _refused(needs: str) -> Refused:
    return Refused("plant-out-of-range", f"A second-order plant needs finite numbers, {needs}.")
