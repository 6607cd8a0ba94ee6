"""ITAE: power laws fitted to the settings of least time-weighted absolute error."""

from __future__ import annotations

from ident.loop import PidSettings
from ident.tune.ellipses import FILTER


def itae(K: float, T: float, L: float, form: str, goal: str) -> PidSettings:
    """Load: Lopez, Miller, Smith and Murrill 1967 (Instrum. Technol. 14, 57-62); setpoint: Rovira 1969.

    With r = L/T, for r of 0.1 to 1. The setpoint PID is not optimal in this controller's form.
    """
    r = L / T
    if goal == "load":
        if form == "pi":
            return PidSettings(0.859 * r**-0.977 / K, T / (0.674 * r**-0.680))
        Td = T * 0.381 * r**0.995
        return PidSettings(1.357 * r**-0.947 / K, T / (0.842 * r**-0.738), Td, Td / FILTER)
    if form == "pi":
        return PidSettings(0.586 * r**-0.916 / K, T / (1.03 - 0.165 * r))
    Td = T * 0.308 * r**0.929
    return PidSettings(0.965 * r**-0.850 / K, T / (0.796 - 0.1465 * r), Td, Td / FILTER)
