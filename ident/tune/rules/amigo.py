"""AMIGO: rules fitted to the largest integral gain under M = 1.4 on a batch of 134 processes."""

from __future__ import annotations

from ident.loop import PidSettings
from ident.tune.ellipses import FILTER


def amigo_pi(K: float, T: float, L: float) -> PidSettings:
    """Kp = 0.15/K + (0.35 - L T/(L + T)^2) T/(K L), Ti = 0.35 L + 13 L T^2/(T^2 + 12 L T + 7 L^2).

    K, T, L > 0 (K of any sign). Astrom and Hagglund 2004, J. Process Control 14, 635-650.
    """
    Kp = 0.15 / K + (0.35 - L * T / (L + T) ** 2) * T / (K * L)
    return PidSettings(Kp, 0.35 * L + 13.0 * L * T**2 / (T**2 + 12.0 * L * T + 7.0 * L**2))


def amigo_pid(K: float, T: float, L: float) -> PidSettings:
    """Kp = (0.2 + 0.45 T/L)/K, Ti = L (0.4 L + 0.8 T)/(L + 0.1 T), Td = 0.5 L T/(0.3 L + T); the same source."""
    Td = 0.5 * L * T / (0.3 * L + T)
    return PidSettings((0.2 + 0.45 * T / L) / K, L * (0.4 * L + 0.8 * T) / (L + 0.1 * T), Td, Td / FILTER)
