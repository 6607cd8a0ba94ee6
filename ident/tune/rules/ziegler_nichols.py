"""Ziegler and Nichols 1942: from the step response, or from the ultimate gain and period."""

from __future__ import annotations

from ident.loop import PidSettings
from ident.tune.ellipses import FILTER
from ident.tune.rules.ultimate import Ultimate


def ziegler_nichols_step(a: float, L: float, form: str) -> PidSettings:
    """PI 0.9/a, 3 L; PID 1.2/a, 2 L, L/2, with a = K L/T (steepest slope times L).

    Ziegler and Nichols 1942, Trans. ASME 64, 759-768.
    """
    if form == "pi":
        return PidSettings(0.9 / a, 3.0 * L)
    return PidSettings(1.2 / a, 2.0 * L, L / 2.0, L / 2.0 / FILTER)


def ziegler_nichols_ultimate(at: Ultimate, form: str) -> PidSettings:
    """PI 0.45 Ku, Pu/1.2; PID 0.6 Ku, Pu/2, Pu/8; the same source."""
    if form == "pi":
        return PidSettings(0.45 * at.Ku, at.Pu / 1.2)
    return PidSettings(0.6 * at.Ku, at.Pu / 2.0, at.Pu / 8.0, at.Pu / 8.0 / FILTER)
