"""Chien, Hrones and Reswick 1952: for a setpoint or a load step, without or with about 20 % overshoot (as labelled)."""

from __future__ import annotations

from ident.loop import PidSettings
from ident.tune.ellipses import FILTER

# (goal, overshoot %, form): Kp a, Ti, whose unit is T for a setpoint and L for a load step, and Td/L.
TABLE = {
    ("setpoint", 0, "pi"): (0.35, 1.2, 0.0),
    ("setpoint", 0, "pid"): (0.6, 1.0, 0.5),
    ("setpoint", 20, "pi"): (0.6, 1.0, 0.0),
    ("setpoint", 20, "pid"): (0.95, 1.4, 0.47),
    ("load", 0, "pi"): (0.6, 4.0, 0.0),
    ("load", 0, "pid"): (0.95, 2.4, 0.42),
    ("load", 20, "pi"): (0.7, 2.3, 0.0),
    ("load", 20, "pid"): (1.2, 2.0, 0.42),
}


def chien_hrones_reswick(K: float, T: float, L: float, form: str, goal: str, overshoot: int = 0) -> PidSettings:
    """Kp from a = K L/T, Ti in T (setpoint) or L (load), Td in L; overshoot 0 or 20, %.

    Chien, Hrones and Reswick 1952, Trans. ASME 74, 175-185. The labels are nominal: on an ideal first-order plant the
    20 % PI overshoots by 12 %.
    """
    gain, integral, derivative = TABLE[goal, overshoot, form]
    Td = derivative * L
    return PidSettings(gain * T / (K * L), integral * (T if goal == "setpoint" else L), Td, Td / FILTER)
