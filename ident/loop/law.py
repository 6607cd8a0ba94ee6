"""ControlLaw: a digital PID as the difference equation that a log shows, and the plant as that controller meets it.

    u[k] = Kp (b r - y) + Kp h/(2 Ti) sum(e[i] + e[i-1]) + Kp Td/h (c (r[k] - r[k-1]) - (y[k] - y[k-1]))

Any rule of integration has this shape: backward and forward sums differ from it by Kp h/(2 Ti) in the gain of e.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ident.loop.held_plant import held_plant
from ident.loop.margins import Margins, loop_margins
from ident.loop.settings import PidSettings
from ident.loop.simulate import zero_order
from ident.loop.sweep import OpenLoop
from ident.plants import Arx
from ident.plants.steps import Lagged

Complex = NDArray[np.complex128]
Floats = NDArray[np.float64]
FilterOn = Literal["none", "derivative", "speed", "speed, second order"]


@dataclass(frozen=True, slots=True)
class ControlLaw:
    """The feedback path of a recovered controller.

    settings   trapezoidal reading; the filter of time constant Tf by backward difference
    h          period of the controller, s;  latency  s, from the logged speed to the command that answers to it
    filter_on  what the filter acts on: 1/(1 + s Tf) on the derivative or the speed, or 1/(1 + s Tf + (s Tf)^2/2) on
               the speed
    """

    settings: PidSettings
    h: float
    latency: float
    filter_on: FilterOn

    @property
    def Ti(self) -> float:
        return self.settings.Ti

    @property
    def Td(self) -> float:
        return self.settings.Td

    @property
    def Tf(self) -> float:
        return self.settings.Tf

    def frequency_response(self, w: ArrayLike) -> Complex:
        """From speed to minus the command at z = exp(jwh), for w in rad/s, 0 < w <= pi/h."""
        s, h = self.settings, self.h
        w = np.asarray(w, dtype=np.float64)
        # 1 - z^-1 without the cancellation at low frequencies.
        change = -np.expm1(-1j * w * h)
        slow = s.Tf / h * change
        lag = 1.0 / (1.0 + slow + (slow**2 / 2.0 if self.filter_on == "speed, second order" else 0.0))
        derivative = s.Td / h * change * (lag if self.filter_on == "derivative" else 1.0)
        response = s.Kp * (1.0 + h / (2.0 * s.Ti) * (2.0 - change) / change + derivative)
        if self.filter_on not in ("none", "derivative"):
            response = response * lag
        return np.asarray(response * np.exp(-1j * w * self.latency), dtype=np.complex128)


@dataclass(frozen=True, slots=True)
class HoldEquivalent:
    """A plant behind a zero-order hold, sampled every h s: what a digital controller meets, exact up to pi/h."""

    plant: Lagged
    h: float
    sampled: tuple[int, Floats, Floats] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "sampled", zero_order(self.plant, self.h))

    @property
    def static_gain(self) -> float:
        return float(self.plant.static_gain)

    @property
    def dead_time(self) -> float:
        return float(self.plant.dead_time) + self.h / 2.0

    def frequency_response(self, w: ArrayLike) -> Complex:
        """B(z)/A(z) at z = exp(jwh)."""
        delay, numerator, denominator = self.sampled
        back = np.exp(-1j * self.h * np.asarray(w, dtype=np.float64))
        polynomial = np.polynomial.polynomial.polyval
        return np.asarray(
            back**delay * polynomial(back, numerator) / polynomial(back, denominator), dtype=np.complex128
        )


def law_loop(plant: Lagged | Arx, law: ControlLaw) -> OpenLoop:
    """The sampled loop of a plant and a difference equation, at z = exp(jwh) up to pi/h.

    An Arx plant holds its own sampling; where the controller is slower, half the difference is added as delay.
    """
    if isinstance(plant, Arx):
        return OpenLoop(held_plant(plant, compute_delay=max(law.h - plant.h, 0.0) / 2.0), law)
    return OpenLoop(held_plant(HoldEquivalent(plant, law.h)), law)


def law_margins(plant: Lagged | Arx, law: ControlLaw) -> Margins:
    """Margins of that loop. Raises Refused low-frequency-unclear."""
    return loop_margins(law_loop(plant, law))
