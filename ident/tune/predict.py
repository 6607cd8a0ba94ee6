"""Predict: setpoint and load step of a tuned loop, simulated until both have settled."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from ident.errors import Refused
from ident.loop import PidSettings, margins
from ident.loop.simulate import Clock, Trace, load_step, setpoint_step
from ident.plants.steps import Lagged, quickest
from ident.tune.predicted import Predicted, read_load_step, read_setpoint_step

FINE = 100.0  # steps per shortest time of an analogue loop: error about 1e-5 of the step
SAMPLES = 200_000
SUBSTEPS = 20  # points per time constant between the samples of a digital controller
DOUBLINGS = 12
DIVERGED = 100.0  # errors; a loop within any sensible target never comes near this
SETTLED = 1e-4  # of the largest error: so little is left of the IAE after that


def predict(plant: Any, settings: PidSettings, *, period: float = 0.0, compute_delay: float = 0.0) -> Predicted:
    """Closed-loop answers to a unit setpoint step and a unit load step at the plant input, from rest.

    plant          of one or two lags, or a fit of one;  period  s, 0: analogue;  compute_delay  s
    Digital: exact at the samples and between them, trapezoidal integral. Analogue: about 1e-5 of the step.
    The load enters at a sample, the least favourable moment. IAE counts up to where both have settled.
    Raises Refused: not-simulated, loop-unstable, sampled-loop-unstable, derivative-without-filter.
    """
    model = lagged(plant)
    if model is None:
        raise Refused("not-simulated", "Only models of one or two lags with dead time are simulated so far.")
    if not margins(model, settings, period=period, compute_delay=compute_delay).stable:
        raise Refused("loop-unstable", "This loop is unstable: there is no settled response to predict.")
    rehearsal = Rehearsal(model, settings, period, compute_delay)
    rehearsal.check()
    return Predicted(read_setpoint_step(rehearsal.setpoint()), read_load_step(rehearsal.load()))


def lagged(plant: Any) -> Lagged | None:
    """The plant of one or two lags in a plant or fit, or None."""
    model = plant if isinstance(plant, Lagged) else getattr(plant, "model", None)
    return model if isinstance(model, Lagged) else None


class Rehearsal:
    """One loop on one clock, long enough for setpoint and load step to settle (or as long as is affordable)."""

    def __init__(self, plant: Lagged, settings: PidSettings, period: float, compute_delay: float) -> None:
        self.plant, self.settings, self.compute_delay = plant, settings, compute_delay
        self.settles = True
        delay = plant.L + compute_delay + period
        fastest = (1.0 + abs(plant.K * settings.Kp)) / quickest(plant) + 1.0 / settings.Ti
        if settings.Tf > 0:
            fastest += 1.0 / settings.Tf
        duration = 4.0 * (delay + settings.Ti + 1.0 / fastest)
        if period > 0 and SUBSTEPS * duration / period > SAMPLES:
            # So many samples: the hold is no more than half a period of dead time.
            period, self.compute_delay = 0.0, compute_delay + period / 2.0
        # Motion much faster than the dead time need not be followed closely to know what comes after.
        coarsest = max(0.1 / fastest, delay / 2000.0)
        for _ in range(DOUBLINGS):
            self.clock = self._clock(period, duration, fastest)
            if self._settled() or not self.settles:
                break
            duration *= 2.0
            if self.clock.samples * self.clock.substeps >= SAMPLES and (period > 0 or self.clock.step > coarsest):
                break

    def check(self) -> None:
        """Refuse a sampled loop that does not settle although its continuous approximation would."""
        if not self.settles:
            raise Refused(
                "sampled-loop-unstable",
                "At this period the sampled loop does not settle: use a shorter period or a calmer target.",
            )

    def setpoint(self, b: float | None = None) -> Trace:
        settings = self.settings if b is None else replace(self.settings, b=b)
        return setpoint_step(self.plant, settings, self.clock, compute_delay=self.compute_delay)

    def load(self) -> Trace:
        return load_step(self.plant, self.settings, self.clock, compute_delay=self.compute_delay)

    def _clock(self, period: float, duration: float, fastest: float) -> Clock:
        if period == 0:
            step = max(1.0 / (FINE * fastest), duration / SAMPLES)
            return Clock(step, int(np.ceil(duration / step)) + 1, digital=False)
        samples = int(np.ceil(duration / period)) + 1
        substeps = int(np.clip(np.ceil(SUBSTEPS * period / quickest(self.plant)), 1, 50))
        return Clock(period, samples, substeps)

    def _settled(self) -> bool:
        for trace, end in ((self.setpoint(), 1.0), (self.load(), 0.0)):
            error = np.abs(trace.speed - end)
            self.settles = bool(error.max() < DIVERGED * (1.0 + abs(self.plant.K)))
            if not self.settles:
                return False
            if float(error[-len(error) // 4 :].max()) > SETTLED * float(error.max()):
                return False
        return True
