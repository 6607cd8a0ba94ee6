"""What tuning needs of a plant: its frequency response, static gain and dead time."""

from __future__ import annotations

from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray


class Plant(Protocol):
    """Anything stable with a frequency response."""

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """P(jw), w in rad/s."""
