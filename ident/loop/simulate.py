"""Closed-loop response of a plant of one or two lags with dead time, digital or analogue, in difference equations.

The plant's response to what enters from outside is written down in closed form; what the feedback adds is a
linear recursion, y = y_open - P C y, run by scipy's compiled filter:

- digital (period > 0): zero-order hold with fractional dead time and a controller in trapezoidal form,
  I_k = I_(k-1) + Kp h/(2 Ti) (e_k + e_(k-1)), filter and derivative by backward difference (Tustin's rings
  where the filter is short). Exact at the samples.
- analogue (period 0): y is continuous, so P C y with y taken as straight between close samples (first-order
  hold) and C by Tustin's rule is right to second order in the step.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from ident.errors import Refused
from ident.loop.settings import PidSettings
from ident.plants.steps import Lagged, ramp_answer, sampled_poles, step_answer

Floats = NDArray[np.float64]

FEW = 48  # delay samples up to which one dense recursion is cheaper than one call per delay


@dataclass(frozen=True, slots=True, eq=False)
class Trace:
    """A closed-loop response from rest: changes of speed and controller output, (n,) each, time in s from 0."""

    time: Floats
    speed: Floats
    command: Floats


@dataclass(frozen=True, slots=True)
class Clock:
    """The grid of a simulation.

    step       s: the period of a digital controller, else small against the loop
    samples    number of steps
    substeps   points drawn per step of a digital controller: the speed moves on between samples
    digital    False: analogue controller
    """

    step: float
    samples: int
    substeps: int = 1
    digital: bool = True

    @property
    def time(self) -> Floats:
        return np.asarray(self.step * np.arange(self.samples), dtype=np.float64)


def setpoint_step(plant: Lagged, settings: PidSettings, clock: Clock, *, compute_delay: float = 0.0) -> Trace:
    """Answer to a setpoint step of 1 at time 0; compute_delay, s, from sample to command.

    Raises Refused derivative-without-filter.
    """
    delayed = replace(plant, L=plant.L + compute_delay)
    s, time = settings, clock.time
    if clock.digital:
        # Trapezoid of the reference's part of the error, which is zero before the step.
        reference = s.Kp * (s.b + (time + clock.step / 2) / s.Ti)
        open_speed = _through_hold(delayed, clock.step, reference)
    else:
        reference = s.Kp * (s.b + time / s.Ti)
        after = time - delayed.L
        open_speed = s.Kp * (s.b * step_answer(delayed, after) + ramp_answer(delayed, after) / s.Ti)
    speed = _close(delayed, settings, clock, open_speed)
    command = reference - _feedback(settings, clock, speed)
    return _between(delayed, clock, speed, command, None)


def load_step(plant: Lagged, settings: PidSettings, clock: Clock, *, compute_delay: float = 0.0) -> Trace:
    """Answer to a step of 1 at time 0 at the plant input; arguments as for `setpoint_step`."""
    delayed = replace(plant, L=plant.L + compute_delay)
    # The load itself does not wait for the computer.
    open_speed = step_answer(plant, clock.time - plant.L)
    speed = _close(delayed, settings, clock, open_speed)
    command = -_feedback(settings, clock, speed)
    return _between(delayed, clock, speed, command, plant)


def _between(delayed: Lagged, clock: Clock, speed: Floats, command: Floats, loaded: Lagged | None) -> Trace:
    """Draw a digital loop's speed between samples, from the held command and the load."""
    if not clock.digital or clock.substeps == 1:
        return Trace(clock.time, speed, command)
    step = clock.step / clock.substeps
    held = np.repeat(command, clock.substeps)
    time = np.asarray(step * np.arange(len(held)), dtype=np.float64)
    finer = _through_hold(delayed, step, held)
    if loaded is not None:
        finer = finer + step_answer(loaded, time - loaded.L)
    return Trace(time, finer, held)


def zero_order(plant: Lagged, h: float) -> tuple[int, Floats, Floats]:
    """(delay samples, numerator, denominator) of the plant behind a zero-order hold.

    The hold makes a pulse of one sample, a difference of steps; the plant's answer to it, times the denominator, is
    the numerator of the modified z-transform (Astrom and Wittenmark, Computer-Controlled Systems).
    """
    whole = int(np.floor(plant.L / h + 1e-9))
    den = sampled_poles(plant, h)
    at = np.asarray(h * (whole + np.arange(1, len(den) + 1)) - plant.L, dtype=np.float64)
    pulse = step_answer(plant, at) - step_answer(plant, at - h)
    return whole + 1, np.convolve(pulse, den)[: len(den)], den


def first_order(plant: Lagged, h: float) -> tuple[int, Floats, Floats]:
    """The same for an input that is straight between samples: each sample makes a triangle."""
    whole = int(np.floor(plant.L / h + 1e-9))
    den = sampled_poles(plant, h)
    at = np.asarray(h * (whole + np.arange(0, len(den) + 1)) - plant.L, dtype=np.float64)
    pulse = (ramp_answer(plant, at + h) - 2 * ramp_answer(plant, at) + ramp_answer(plant, at - h)) / h
    return whole, np.convolve(pulse, den)[: len(den) + 1], den


def _through_hold(plant: Lagged, h: float, command: Floats) -> Floats:
    delay, num, den = zero_order(plant, h)
    speed = np.zeros(len(command))
    speed[delay:] = lfilter(num, den, command)[: max(len(command) - delay, 0)]
    return speed


def _controller(settings: PidSettings, clock: Clock) -> tuple[Floats, Floats]:
    """C F in powers of z^-1: trapezoidal integral; filter and derivative by backward difference or Tustin."""
    h = clock.step
    Kp, Ti, Td, Tf = settings.Kp, settings.Ti, settings.Td, settings.Tf
    if clock.digital or (Td == 0 and Tf == 0):
        difference, total = np.array([1.0, -1.0]), np.array([1.0, 1.0]) * h / (2.0 * Ti)
        slope = difference / h
        filtered = np.array([1.0, 0.0, 0.0])
        filtered[:2] += Tf * slope
        filtered += Tf**2 / 2 * np.convolve(slope, slope)
        lead = np.array([1.0, 0.0]) + Td * slope
        num = Kp * (np.convolve(difference, lead) + np.append(total, 0.0))
        return np.asarray(num, np.float64), np.asarray(np.convolve(difference, filtered), np.float64)
    minus, plus = np.array([2.0, -2.0]) / h, np.array([1.0, 1.0])
    if Tf == 0:
        raise Refused(
            "derivative-without-filter", "A derivative without filter cannot be simulated: give Tf, say Td/10."
        )
    twice, mixed, squared = np.convolve(plus, plus), np.convolve(minus, plus), np.convolve(minus, minus)
    num = Kp / Ti * (twice + Ti * mixed + Ti * Td * squared)
    den = np.convolve(minus, twice + Tf * mixed + Tf**2 / 2 * squared)
    return np.asarray(np.convolve(num, plus), np.float64), np.asarray(den, np.float64)


def _feedback(settings: PidSettings, clock: Clock, speed: Floats) -> Floats:
    num, den = _controller(settings, clock)
    return np.asarray(lfilter(num, den, speed), dtype=np.float64)


def _close(plant: Lagged, settings: PidSettings, clock: Clock, open_speed: Floats) -> Floats:
    """y = y_open - P C y."""
    delay, plant_num, plant_den = (zero_order if clock.digital else first_order)(plant, clock.step)
    c_num, c_den = _controller(settings, clock)
    num, den = np.convolve(plant_num, c_num), np.convolve(plant_den, c_den)
    if delay < FEW:
        closed = np.zeros(max(len(den), len(num) + delay))
        closed[: len(den)] = den
        closed[delay : delay + len(num)] += num
        return np.asarray(lfilter(den, closed, open_speed), dtype=np.float64)
    # Method of steps: one delay's worth of feedback is known before it arrives.
    speed = np.array(open_speed)
    state = np.zeros(max(len(num), len(den)) - 1)
    for start in range(delay, len(speed), delay):
        block = speed[start : start + delay]
        arrived, state = lfilter(num, den, speed[start - delay : start], zi=state)
        block -= arrived[: len(block)]
    return speed
