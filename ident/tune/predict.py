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
    return rehearsal.predicted(settings.b)


def lagged(plant: Any) -> Lagged | None:
    """The plant of one or two lags in a plant or fit, or None."""
    model = plant if isinstance(plant, Lagged) else getattr(plant, "model", None)
    return model if isinstance(model, Lagged) else None


class Rehearsal:
    """One loop on one clock, long enough for setpoint and load step to settle (or as long as is affordable).

    The loop is linear: two setpoint steps, of weight 0 and of weight 1, tell the answer for every weight b.
    """

    def __init__(self, plant: Lagged, settings: PidSettings, period: float, compute_delay: float) -> None:
        self._plant, self._settings, self._compute_delay = plant, settings, compute_delay
        self._settles = True
        delay = plant.L + compute_delay + period
        fastest = (1.0 + abs(plant.K * settings.Kp)) / quickest(plant) + 1.0 / settings.Ti
        if settings.Tf > 0:
            fastest += 1.0 / settings.Tf
        duration = 4.0 * (delay + settings.Ti + 1.0 / fastest)
        if period > 0 and SUBSTEPS * duration / period > SAMPLES:
            # So many samples: the hold is no more than half a period of dead time.
            period, self._compute_delay = 0.0, compute_delay + period / 2.0
        # Motion much faster than the dead time need not be followed closely to know what comes after.
        coarsest = max(0.1 / fastest, delay / 2000.0)
        for _ in range(DOUBLINGS):
            self._clock = self._grid(period, duration, fastest)
            self._full, self._load = self._simulate(1.0), self._simulate_load()
            if self._settled() or not self._settles:
                break
            duration *= 2.0
            if self._clock.samples * self._clock.substeps >= SAMPLES and (period > 0 or self._clock.step > coarsest):
                break
        self._without = self._simulate(0.0)

    def check(self) -> None:
        """Refuse a sampled loop that does not settle although its continuous approximation would."""
        if not self._settles:
            raise Refused(
                "sampled-loop-unstable",
                "At this period the sampled loop does not settle: use a shorter period or a calmer target.",
            )

    def setpoint(self, b: float) -> Trace:
        """Answer to a setpoint step of 1 with setpoint weight b."""
        none, full = self._without, self._full
        return Trace(
            full.time, none.speed + b * (full.speed - none.speed), none.command + b * (full.command - none.command)
        )

    def predicted(self, b: float) -> Predicted:
        """Both steps, with setpoint weight b."""
        return Predicted(read_setpoint_step(self.setpoint(b)), read_load_step(self._load))

    def _simulate(self, b: float) -> Trace:
        weighed = replace(self._settings, b=b)
        return setpoint_step(self._plant, weighed, self._clock, compute_delay=self._compute_delay)

    def _simulate_load(self) -> Trace:
        return load_step(self._plant, self._settings, self._clock, compute_delay=self._compute_delay)

    def _grid(self, period: float, duration: float, fastest: float) -> Clock:
        if period == 0:
            step = max(1.0 / (FINE * fastest), duration / SAMPLES)
            return Clock(step, int(np.ceil(duration / step)) + 1, digital=False)
        samples = int(np.ceil(duration / period)) + 1
        substeps = int(np.clip(np.ceil(SUBSTEPS * period / quickest(self._plant)), 1, 50))
        return Clock(period, samples, substeps)

    def _settled(self) -> bool:
        for trace, end in ((self._full, 1.0), (self._load, 0.0)):
            error = np.abs(trace.speed - end)
            self._settles = bool(error.max() < DIVERGED * (1.0 + abs(self._plant.K)))
            if not self._settles:
                return False
            if float(error[-len(error) // 4 :].max()) > SETTLED * float(error.max()):
                return False
        return True
