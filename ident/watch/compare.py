"""Compare: one night against a level, jointly and parameter by parameter.

The joint statistic is the squared distance (z - level)' V^-1 (z - level), V the night's own covariance, the scatter
between nights and the level's covariance added. With nothing estimated but the mean it is chi-squared with 3
degrees of freedom. As far as V rests on a scatter that few nights told, it is Hotelling's T^2, with degrees of freedom
nu matched to the first moments of V:

    nu = 3 (3 + 1) n_X / (tr M^2 + (tr M)^2),  M = X V^-1,      T^2 ~ 3 nu/(nu - 2) F(3, nu - 2)

(Krishnamoorthy and Yu 2004, Stat. Probab. Lett. 66, 161-169, their affine-invariant form of Nel and van der Merwe
1986; n_X degrees of freedom behind X). Where X is all of V this is the textbook limit for a future observation. One
parameter takes the same with dimension 1: Student's t with Satterthwaite's degrees of freedom (1946).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import chdtrc, chdtri, fdtrc, fdtri

from ident.record.segments import Floats
from ident.watch.level import Level

KNOWN = 1e6  # degrees of freedom from which V counts as known


@dataclass(frozen=True, slots=True)
class Distance:
    """A squared distance with the threshold it is held to.

    p   probability of as much or more while nothing has moved
    """

    statistic: float
    threshold: float
    p: float

    @property
    def significant(self) -> bool:
        """Whether the statistic is above its threshold."""
        return self.statistic > self.threshold


def joint(z: Floats, own: Floats, level: Level, significance: float) -> Distance:
    """Distance of a night at z (3,) with covariance `own` (3, 3), all three parameters together."""
    total = own + level.scatter + level.covariance
    size = np.sqrt(np.diagonal(total))
    inverse = np.linalg.inv(total / np.outer(size, size))
    away = (z - level.z) / size
    part = (1.0 + level.share) * level.scatter / np.outer(size, size) @ inverse
    moments = float(np.trace(part @ part) + np.trace(part) ** 2)
    degrees = 12.0 * level.degrees / moments if moments > 0.0 else np.inf
    return _held(float(away @ inverse @ away), 3, degrees, significance)


def along(change: float, variance: float, estimated: float, degrees: float, significance: float) -> Distance:
    """Distance of one parameter: its change, the variance of that, and the part of it that rests on the scatter."""
    freedom = degrees * (variance / estimated) ** 2 if estimated > 0.0 else np.inf
    return _held(change**2 / variance, 1, freedom, significance)


def _held(statistic: float, dimension: int, degrees: float, significance: float) -> Distance:
    if degrees > KNOWN:
        return Distance(
            statistic, float(chdtri(dimension, significance)), float(chdtrc(dimension, max(statistic, 0.0)))
        )
    # n nights scatter in at most n - 1 directions, which leaves at least one degree of freedom.
    left = max(degrees - dimension + 1.0, 1.0)
    factor = dimension * (left + dimension - 1.0) / left
    return Distance(
        statistic,
        factor * float(fdtri(dimension, left, 1.0 - significance)),
        float(fdtrc(dimension, left, statistic / factor)),
    )
