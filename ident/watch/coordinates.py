"""Coordinates in which estimates are near normal: z = (K/T, 1/T, L), the plant written b exp(-L s)/(s + a).

The response is close to linear in b and a even where the log is short against T. There K and T are each known
by an order of magnitude and their logarithms are far from normal, while b is known to a few percent and a is a
small number with an ordinary error. The joint test does not see units or linear changes of coordinates.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.record.segments import Floats
from ident.watch.night import Night


def place(night: Night) -> Floats:
    """(3,) coordinates of a night's plant."""
    return np.array([night.K / night.T, 1.0 / night.T, night.L])


def slopes(K: float, T: float) -> Floats:
    """d(b, a, L)/d(K, T, L), (3, 3)."""
    return np.array([[1.0 / T, -K / T**2, 0.0], [0.0, -1.0 / T**2, 0.0], [0.0, 0.0, 1.0]])


def covariance(night: Night) -> Floats:
    """(3, 3), the night's covariance in these coordinates, to first order."""
    to = slopes(night.K, night.T)
    matrix = np.array(night.covariance)
    return np.asarray(to @ (matrix + matrix.T) @ to.T / 2.0)


@dataclass(frozen=True, slots=True, eq=False)
class Reading:
    """A parameter at some coordinates: its value, and its gradient there, (3,)."""

    value: float
    gradient: Floats


def readings(z: Floats) -> dict[str, Reading]:
    """What people read off a plant: K, T, L and K/T; a must be above 0."""
    b, a, L = (float(v) for v in z)
    return {
        "K": Reading(b / a, np.array([1.0 / a, -b / a**2, 0.0])),
        "T": Reading(1.0 / a, np.array([0.0, -1.0 / a**2, 0.0])),
        "L": Reading(L, np.array([0.0, 0.0, 1.0])),
        "K/T": Reading(b, np.array([1.0, 0.0, 0.0])),
    }
