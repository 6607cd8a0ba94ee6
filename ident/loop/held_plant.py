"""HeldPlant: the plant as the controller meets it, with hold and computing delay."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ident.errors import Refused
from ident.plants import Plant

Complex = NDArray[np.complex128]


@dataclass(frozen=True, slots=True, eq=False)
class HeldPlant:
    """P(jw) exp(-jw lag).

    lag     s, added to the plant's own dead time: period/2 + compute_delay, or compute_delay alone where
            P holds its own sampling
    w_max   rad/s: response valid up to here (pi/h of a sampled model), else inf
    """

    plant: Plant
    lag: float
    w_max: float

    @property
    def known_delay(self) -> float:
        """All dead time that is known of, s; a plant that states none may still hide some in its response."""
        return self.lag + float(getattr(self.plant, "dead_time", 0.0))

    def __call__(self, w: ArrayLike) -> Complex:
        """Response at w in rad/s, > 0, any shape."""
        w = np.asarray(w, dtype=np.float64)
        # Raveled: a caller's own plant need not know about shapes.
        flat = w.ravel()
        if len(flat) == 0:
            return np.zeros(w.shape, dtype=np.complex128)
        response = np.asarray(self.plant.frequency_response(flat), dtype=np.complex128) * np.exp(-1j * self.lag * flat)
        if response.shape != flat.shape or not np.isfinite(response).all():
            raise Refused(
                "plant-response-unusable",
                "frequency_response(w) must return one finite complex number per frequency for w > 0.",
            )
        return response.reshape(w.shape)


def held_plant(plant: Any, period: float = 0.0, compute_delay: float = 0.0) -> HeldPlant:
    """Put the controller's hold and computing delay in front of a plant.

    plant           a model or a fit (its `model` is taken); an attribute `h` marks a sampled model, which
                    holds its own sampling
    period          controller sample time, s, >= 0 (0: analogue);  compute_delay  s, >= 0
    Raises Refused: period-out-of-range, plant-without-response.
    """
    for name, value in (("period", period), ("compute_delay", compute_delay)):
        if not (np.isfinite(value) and value >= 0):
            raise Refused(f"{name.replace('_', '-')}-out-of-range", f"{name} must be 0 s or more; got {value}.")
    if not hasattr(plant, "frequency_response"):
        plant = getattr(plant, "model", plant)
    if not hasattr(plant, "frequency_response"):
        raise Refused("plant-without-response", "A plant needs frequency_response(w): pass a fit, a model or your own.")
    h = getattr(plant, "h", None)
    if h is None:
        return HeldPlant(plant, period / 2.0 + compute_delay, np.inf)
    return HeldPlant(plant, compute_delay, np.pi / float(h))
