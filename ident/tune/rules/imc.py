"""IMC and lambda tuning: settings that make the closed loop first order with a time constant of choice."""

from __future__ import annotations

from ident.loop import PidSettings
from ident.tune.ellipses import FILTER


def lambda_pi(K: float, T: float, L: float, Tc: float) -> PidSettings:
    """Kp = T/(K (Tc + L)), Ti = T: the lag is cancelled (Dahlin 1968; Rivera, Morari and Skogestad 1986)."""
    return PidSettings(T / (K * (Tc + L)), T)


def imc_pi(K: float, T: float, L: float, Tc: float) -> PidSettings:
    """Improved PI: Kp = (2 T + L)/(2 K Tc), Ti = T + L/2; Tc above 1.7 L and 0.1 T.

    Rivera, Morari and Skogestad 1986, Ind. Eng. Chem. Process Des. Dev. 25, 252-265.
    """
    return PidSettings((2.0 * T + L) / (2.0 * K * Tc), T + L / 2.0)


def imc_pid(K: float, T: float, L: float, Tc: float) -> PidSettings:
    """Kp = (2 T + L)/(K (2 Tc + L)), Ti = T + L/2, Td = T L/(2 T + L); Tc above 0.8 L and 0.1 T; the same source."""
    Td = T * L / (2.0 * T + L)
    return PidSettings((2.0 * T + L) / (K * (2.0 * Tc + L)), T + L / 2.0, Td, Td / FILTER)
