"""Arx: a difference equation from command to speed, as a sampled log shows the plant.

    y[k] + a[0] y[k-1] + a[1] y[k-2] + ... = b[0] u[k-delay] + b[1] u[k-delay-1] + ...

The command is held between samples, so the response includes the hold and ends at w = pi/h.
(Ljung, System Identification: Theory for the User, 1999, section 4.2.)
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.signal import lfilter

from ident.errors import Refused

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Arx:
    """B(q) q^-delay / A(q) at the sample time h.

    a       coefficients of past speeds, the leading 1 left out; may be empty
    b       coefficients of commands, speed unit per command unit; not all 0
    delay   samples from a command to its first effect, >= 1
    h       sample time, s, > 0
    """

    a: Sequence[float]
    b: Sequence[float]
    delay: int
    h: float

    def __post_init__(self) -> None:
        for name in ("a", "b"):
            object.__setattr__(self, name, tuple(float(v) for v in np.ravel(getattr(self, name))))
        whole = self.delay == int(self.delay) if np.isfinite(self.delay) else False
        if not (
            np.isfinite([*self.a, *self.b, self.h]).all() and any(self.b) and whole and self.delay >= 1 and self.h > 0
        ):
            raise Refused(
                "plant-out-of-range",
                "An ARX plant needs finite a and b with some b not 0, a whole delay of 1 or more and h > 0; "
                f"got a={self.a}, b={self.b}, delay={self.delay}, h={self.h}.",
            )
        object.__setattr__(self, "delay", int(self.delay))
        object.__setattr__(self, "h", float(self.h))

    @property
    def static_gain(self) -> float:
        """Change of y per lasting change of u; infinite where the equation integrates."""
        total = 1.0 + math.fsum(self.a)
        return math.fsum(self.b) / total if total != 0.0 else math.copysign(math.inf, math.fsum(self.b))

    @property
    def dead_time(self) -> float:
        """(delay - 1) h, s: with a held command the sample after a move is the first that can show it."""
        return (self.delay - 1) * self.h

    @property
    def poles(self) -> tuple[complex, ...]:
        """Roots of z^na + a[0] z^(na-1) + ...; the plant is stable where all lie inside the unit circle."""
        return tuple(complex(z) for z in np.roots([1.0, *self.a]))

    @property
    def stable(self) -> bool:
        return all(abs(z) < 1.0 for z in self.poles)

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        """P(jw) with the hold, for w in rad/s up to pi/h, any shape."""
        back = np.exp(-1j * self.h * np.asarray(w, dtype=np.float64))
        response: NDArray[np.complex128] = (
            back**self.delay
            * np.polynomial.polynomial.polyval(back, self.b)
            / np.polynomial.polynomial.polyval(back, (1.0, *self.a))
        )
        return response

    def simulate(self, command: ArrayLike) -> Floats:
        """Speeds (n,) for commands (n,) logged every h, from rest: u and y were 0 before the first."""
        numerator = np.concatenate((np.zeros(self.delay), self.b))
        return np.asarray(lfilter(numerator, (1.0, *self.a), np.asarray(command, dtype=np.float64)))
