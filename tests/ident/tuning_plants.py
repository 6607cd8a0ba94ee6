"""Plants of the tuning tests: those of the reference table, and a wrapper that counts what is asked of them."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ident.plants import Fopdt

Complex = NDArray[np.complex128]


@dataclass(frozen=True)
class FourLags:
    """1/(s + 1)^4, as a caller would write it."""

    def frequency_response(self, w: ArrayLike) -> Complex:
        return np.asarray(1.0 / (1.0 + 1j * np.asarray(w)) ** 4)


@dataclass
class Counting:
    """A plant that counts how many points it is asked for."""

    plant: Any
    points: int = field(default=0)

    @property
    def dead_time(self) -> float:
        return float(getattr(self.plant, "dead_time", 0.0))

    def frequency_response(self, w: ArrayLike) -> Complex:
        self.points += np.size(w)
        return np.asarray(self.plant.frequency_response(w))


def reference_plant(name: str) -> Any:
    return FourLags() if name == "lag4_equal" else Fopdt(1.0, 1.0, float(name.removeprefix("FOPDT_L")))
