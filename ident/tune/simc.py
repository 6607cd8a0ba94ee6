"""SIMC: Skogestad's PI rule for a first-order plant with dead time."""

from __future__ import annotations

import numpy as np

from ident.errors import Refused
from ident.loop import PidSettings
from ident.plants import Fopdt
from ident.tune.ellipses import FILTER


def simc(K: float, T: float, L: float, *, Tc: float | None = None) -> PidSettings:
    """Kp = T/(K (Tc + L)), Ti = min(T, 4 (Tc + L)): Skogestad 2003, J. Process Control 13, 291-309.

    K, T, L  of the plant; L is all the dead time in the loop, half the controller's period and the computing
             delay included, s
    Tc       closed-loop time constant, s; L unless given
    Raises Refused: plant-out-of-range, closed-loop-time-missing (L = 0 and no Tc), closed-loop-time-out-of-range.
    """
    Fopdt(K, T, L)
    if Tc is None:
        if L == 0:
            raise Refused(
                "closed-loop-time-missing",
                "Without dead time the rule needs the closed-loop time constant Tc: give Tc, or the controller's "
                "period.",
            )
        Tc = L
    if not (np.isfinite(Tc) and Tc > -L):
        raise Refused("closed-loop-time-out-of-range", f"Tc must be above -L = {-L:g} s, usually L or more; got {Tc}.")
    return PidSettings(T / (K * (Tc + L)), min(T, 4.0 * (Tc + L)))


def improved_simc(K: float, T: float, L: float, *, Tc: float | None = None) -> PidSettings:
    """Kp = (T + L/3)/(K (Tc + L)), Ti = min(T + L/3, 4 (Tc + L)): Grimholt and Skogestad 2012, IFAC PID'12.

    Arguments and errors as for `simc`.
    """
    found = simc(K, T, L, Tc=Tc)
    Tc = L if Tc is None else Tc
    T = T + L / 3.0
    return PidSettings(found.Kp * T / (T - L / 3.0), min(T, 4.0 * (Tc + L)))


def simc_pid(
    K: float, T: float, L: float, T2: float | None = None, *, Tc: float | None = None, ratio: float = FILTER
) -> PidSettings:
    """The series PID of SIMC in ideal form: derivative time T2 (a second lag), or L/3 without one; Tf = Td/ratio.

    T2 from Skogestad 2003; L/3 (improved SIMC) from Grimholt and Skogestad 2018, J. Process Control 70, 36-46.
    """
    series = simc(K, T, L, Tc=Tc)
    lead = L / 3.0 if T2 is None else T2
    f = 1.0 + lead / series.Ti
    return PidSettings(series.Kp * f, series.Ti * f, lead / f, lead / f / ratio)
