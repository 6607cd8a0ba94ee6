"""From a frequency response to the time response: a window of equally spaced frequencies, summed by one FFT.

A response that starts from rest and dies out is y(t) = 1/pi Re integral of Y(jw) exp(jwt) dw. The frequencies lie at
(k + 1/2) dw, so w = 0, where integral action makes every expression infinite, is never asked for. What the sum gives
is y(t) - y(t + 2 pi/dw) + ...: the window must be longer than the response.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.loop.held_plant import Complex, HeldPlant

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Window:
    """A plant on frequencies that make a time response.

    w           (n,) rad/s;  s  (n,) jw, or what the trapezoidal rule makes of it where the plant is a sampled model
    plant  (n,) sign * P(jw);  behind_lag  (n,) the same with hold and computing delay
    unit_step   (n,) transform of a step of 1; of sampled steps where the plant is a sampled model
    step        s between the 2 n moments of the response
    """

    w: Floats
    s: Complex
    plant: Complex
    behind_lag: Complex
    unit_step: Complex
    step: float

    @property
    def sampled(self) -> bool:
        """Whether the plant is a sampled model, known at its samples only."""
        return bool(self.unit_step[0].real > 0.0)

    @property
    def time(self) -> Floats:
        return np.asarray(self.step * np.arange(2 * len(self.w)), dtype=np.float64)

    def in_time(self, transform: Complex) -> Floats:
        """(..., 2 n) response of a transform (..., n)."""
        n = len(self.w)
        turn = np.exp(0.5j * np.pi / n * np.arange(2 * n))
        summed = np.fft.ifft(transform, 2 * n, axis=-1) * turn
        return np.asarray(summed.real * (2.0 / self.step), dtype=np.float64)

    def back(self, weights: Floats) -> Complex:
        """(..., n) g with sum(weights * in_time(X)) = Re sum(g X) for every X: the transpose of `in_time`."""
        n = len(self.w)
        turn = np.exp(0.5j * np.pi / n * np.arange(2 * n))
        return np.asarray(np.fft.ifft(weights * turn, axis=-1)[..., :n] * (2.0 / self.step), dtype=np.complex128)


def make_window(plant: HeldPlant, sign: float, duration: float, top: float) -> Window:
    """Frequencies for a response of `duration` s, up to `top` rad/s (or as far as a sampled model goes)."""
    sampled = np.isfinite(plant.w_max)
    top = plant.w_max if sampled else top
    n = 2 ** max(6, int(np.ceil(np.log2(top * duration / (2.0 * np.pi)))))
    w = top / n * (np.arange(n) + 0.5)
    behind = sign * plant(w)
    step = np.pi / top
    s = 2j / step * np.tan(w * step / 2.0) if sampled else 1j * w
    unit = step / (1.0 - np.exp(-1j * w * step)) if sampled else 1.0 / s
    return Window(w, s, behind * np.exp(1j * w * plant.lag), behind, unit, step)
