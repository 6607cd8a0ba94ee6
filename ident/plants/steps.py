"""Steps and ramps: what a lagged plant answers after its dead time, in closed form, and its poles when sampled."""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from ident.plants.fopdt import Fopdt
from ident.plants.second_hold import motion
from ident.plants.sopdt import Sopdt, UnderdampedSopdt

Floats = NDArray[np.float64]
Lagged: TypeAlias = Fopdt | Sopdt | UnderdampedSopdt


def step_answer(plant: Lagged, after: Floats) -> Floats:
    """Speed after a unit step, `after` s past the dead time (0 before it)."""
    t = np.maximum(after, 0.0)
    if isinstance(plant, Fopdt):
        return np.asarray(-plant.K * np.expm1(-t / plant.T))
    return np.asarray(plant.K * (1.0 - motion(plant.S, plant.P, t)[0]))


def ramp_answer(plant: Lagged, after: Floats) -> Floats:
    """Speed after a ramp of unit slope per s, `after` s past the dead time."""
    t = np.maximum(after, 0.0)
    if isinstance(plant, Fopdt):
        return np.asarray(plant.K * (t + plant.T * np.expm1(-t / plant.T)))
    c0, c1, _ = motion(plant.S, plant.P, t)
    return np.asarray(plant.K * (t - plant.S + plant.S * c0 - c1))


def sampled_poles(plant: Lagged, h: float) -> Floats:
    """Denominator in powers of z^-1 of the plant sampled every h s."""
    if isinstance(plant, Fopdt):
        return np.array([1.0, -np.exp(-h / plant.T)])
    c0, _, c2 = motion(plant.S, plant.P, h)
    return np.array([1.0, -float(c0 + c2), np.exp(-plant.S / plant.P * h)])


def quickest(plant: Lagged) -> float:
    """The time, s, on which the plant's own motion changes fastest and still matters."""
    if isinstance(plant, Fopdt):
        return plant.T
    # The smaller lag; one far below the other is no more than dead time.
    return max(plant.P / plant.S, 0.02 * plant.S)
