"""What margins need of a controller: its feedback path along frequency, and its times."""

from __future__ import annotations

from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray


class Controller(Protocol):
    """Feedback path with integral time Ti, derivative time Td and filter time Tf, s (0 or inf where there is none)."""

    @property
    def Ti(self) -> float: ...

    @property
    def Td(self) -> float: ...

    @property
    def Tf(self) -> float: ...

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """From speed to minus the command, w in rad/s."""
