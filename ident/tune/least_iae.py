"""The settings with the least IAE after a load or setpoint step, under the limits.

The largest-ki settings come first: they bound what is worth looking at, since an IAE is never less than 1/ki. A coarse
look over derivative times, gains and integral gains below the limit finds the hills (there may be two: overshooting
and not), `climb` their tops.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ident.loop.settings import PidSettings
from ident.tune.band import Band
from ident.tune.climb import climb
from ident.tune.ellipses import Limits
from ident.tune.gaps import tops
from ident.tune.iae import Iae, find_iae

Floats = NDArray[np.float64]

GAINS = 30  # of which only those within the limit are looked at
SHARES = (1.0, 0.8, 0.6)  # of the integral gain at the limit
DERIVATIVES = np.array([0.3, 0.45, 0.65, 0.9, 1.2])  # of the largest-ki solution's Td
STARTS = 2
PRECISION = 1e-5  # relative, of the IAE
HILL = 1.1  # times the best IAE of the coarse look: a start beyond is not worth a climb
APART = 0.15  # log: starts closer than this climb the same hill


def least_iae(band: Band, limits: Limits, goal: str, fastest: PidSettings) -> PidSettings:
    """Settings with the least IAE (goal load or setpoint); fastest: those with the largest ki under these limits.

    Raises Refused not-simulated.
    """
    objective = find_iae(band, fastest, goal, limits.ratio)
    own = PidSettings(abs(fastest.Kp), fastest.Ti, fastest.Td, fastest.Tf)
    candidates = []
    for start in [own, *_starts(band, limits, objective, own)]:
        found = climb(band, limits, start, objective, PRECISION)
        if found is not None:
            candidates.append((objective(logarithms(found))[0], found))
    best = min(candidates, key=lambda c: c[0])[1] if candidates else fastest
    if goal == "setpoint":
        return PidSettings(best.Kp, best.Ti, best.Td, best.Tf, objective.response(logarithms(best)).b)
    return best


def logarithms(settings: PidSettings) -> Floats:
    """log (Kp, ki[, Td]), as the search knows settings."""
    free = [abs(settings.Kp), settings.ki] + ([settings.Td] if settings.Td > 0 else [])
    return np.asarray(np.log(free), dtype=np.float64)


def _starts(band: Band, limits: Limits, objective: Iae, own: PidSettings) -> list[PidSettings]:
    found: list[tuple[float, PidSettings]] = []
    for Td in np.minimum(DERIVATIVES * own.Td, band.residence) if own.Td > 0 else [0.0]:
        Kp, top = tops(band, limits, float(Td), GAINS)
        for share in SHARES:
            for one, ki in zip(Kp, share * top, strict=True):
                if ki * 3.0 < own.ki:
                    continue
                settings = PidSettings(float(one), float(one / ki), float(Td), float(Td) / limits.ratio)
                found.append((objective(logarithms(settings))[0], settings))
    found.sort(key=lambda f: f[0])
    starts: list[PidSettings] = []
    for value, settings in found:
        if value > found[0][0] + np.log(HILL):
            break
        if all(np.max(np.abs(logarithms(settings) - logarithms(other))) > APART for other in [own, *starts]):
            starts.append(settings)
        if len(starts) == STARTS:
            break
    return starts
