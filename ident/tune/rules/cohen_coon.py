"""Cohen and Coon 1953: a quarter of the amplitude left per swing."""

from __future__ import annotations

from ident.loop import PidSettings
from ident.tune.ellipses import FILTER


def cohen_coon(K: float, T: float, L: float, form: str) -> PidSettings:
    """PI Kp = T/(K L) (0.9 + L/12T), Ti = L (30 + 3 L/T)/(9 + 20 L/T); PID Kp = T/(K L) (4/3 + L/4T),
    Ti = L (32 + 6 L/T)/(13 + 8 L/T), Td = 4 L/(11 + 2 L/T). Cohen and Coon 1953, Trans. ASME 75, 827-834.
    """
    r, gain = L / T, T / (K * L)
    if form == "pi":
        return PidSettings(gain * (0.9 + r / 12.0), L * (30.0 + 3.0 * r) / (9.0 + 20.0 * r))
    Td = 4.0 * L / (11.0 + 2.0 * r)
    return PidSettings(gain * (4.0 / 3.0 + r / 4.0), L * (32.0 + 6.0 * r) / (13.0 + 8.0 * r), Td, Td / FILTER)
