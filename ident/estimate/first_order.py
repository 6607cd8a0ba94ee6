"""FirstOrder: the shape of a FOPDT's answer, 1/(T s + 1)."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ident.estimate.layout import Layout, Stretch
from ident.estimate.shape import delayed
from ident.plants.hold import lag_gap, lag_gap_slope
from ident.record.segments import Floats

LONGEST_T = 100.0  # durations of the record; beyond it the plant integrates as far as the log can tell
SHORTEST_T = 0.02  # steps


@dataclass(frozen=True, slots=True)
class FirstOrder:
    """1/(T s + 1), T in s."""

    T: float

    @property
    def lags(self) -> float:
        """Sum of the time constants, s."""
        return self.T

    @property
    def slowest(self) -> float:
        """The time constant, s."""
        return self.T

    def reach(self, layout: Layout) -> tuple[Floats, Floats]:
        """The least and most that one step may take of log T, (1,) each, within what the layout can tell."""
        least = max(math.log(SHORTEST_T * layout.step / self.T), -1.5)
        return np.array([least]), np.array([min(math.log(LONGEST_T * layout.duration / self.T), 1.5)])

    def moved(self, log_steps: Floats, layout: Layout) -> FirstOrder:
        """T after a step of log T, within what the layout can tell."""
        T = self.T * float(np.exp(np.clip(log_steps[0], -1.5, 1.5)))
        return FirstOrder(float(np.clip(T, SHORTEST_T * layout.step, LONGEST_T * layout.duration)))

    def answer(self, stretch: Stretch, L: float) -> tuple[Floats, Floats, Floats]:
        """At the used rows: the answer to the delayed command (n,), its slope in log T (1, n), its slope in L (n,)."""
        T, u, steps, straight = self.T, stretch.given.command, stretch.intervals, stretch.straight
        gap = lag_gap(u, steps, T, straight=straight)
        slope = lag_gap_slope(gap, steps, T, command=u, straight=straight)
        series = (u, gap, slope, stretch.rates) if straight else (u, gap, slope)
        at = delayed(stretch, L, series)
        e, decay = at.since, np.exp(-at.since / T)
        held, q, q_T = at.series[:3]
        left = decay * q
        answer, slope_T, slope_L = held + left, decay * T * q_T + e / T * left, left / T
        if straight:
            m, late = at.series[3], 1.0 - decay
            answer = answer + m * (e - T * late)
            slope_T = slope_T - m * T * (late - decay * e / T)
            slope_L = slope_L - m * late
        return answer, slope_T[None], slope_L

    def transients(self, time: Floats) -> tuple[Floats, Floats]:
        """Free motions from t = 0: exp(-t/T) (1, n), and its slope in log T (1, 1, n)."""
        decay = np.exp(-time / self.T)
        return decay[None], (decay * time / self.T)[None, None]

    def step(self, time: Floats) -> Floats:
        """The answer to a unit step, `time` s after it."""
        return np.asarray(-np.expm1(-time / self.T))

    def impulse(self, time: Floats) -> Floats:
        """The answer to a unit impulse, `time` s after it, per s."""
        return np.asarray(np.exp(-time / self.T) / self.T)
