"""IAE of a load or setpoint step from the plant's frequency response, with its slopes in the settings.

The response comes from one FFT, the slopes from one more: d IAE = integral of sign(e) de (Grimholt and Skogestad 2018,
J. Process Control 71, 1-14, optimise with exact slopes; Hast, Astrom, Bernhardsson and Boyd 2013, ECC, on the same
problem). The setpoint weight that is best for given settings is a weighted median, so it is no unknown of the search.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused
from ident.loop.settings import PidSettings
from ident.loop.time_response import Window, make_window
from ident.tune.band import Band

Floats = NDArray[np.float64]
Complex = NDArray[np.complex128]

TOP = 60.0  # times the frequency where the plant has turned 180 degrees
SETTLED = 3e-4  # of the largest error, left in the last quarter of the window
CUT_OFF = 0.03  # of the largest error: how sharp a bend of the response may still be drawn too round
LONGEST = 2**16  # frequencies of a window


@dataclass(frozen=True, slots=True, eq=False)
class Response:
    """An error in time and what made it.

    error       (2 n,);  b  setpoint weight;  gained  (2 n,) what the error loses per unit of b, None after a load step
    Kp, ki, Td  of the settings;  slow  (n,) the filter;  back  (n,) 1 + L
    """

    error: Floats
    b: float
    gained: Floats | None
    Kp: float
    ki: float
    Td: float
    slow: Complex
    back: Complex


@dataclass(frozen=True, slots=True, eq=False)
class Iae:
    """Integrated absolute error over one window; goal  load | setpoint;  ratio  Td/Tf."""

    window: Window
    goal: str
    ratio: float

    def __call__(self, x: Floats) -> tuple[float, Floats]:
        """log IAE at x = log (Kp, ki[, Td]) of a plant of positive sign, and its gradient."""
        r = self.response(x)
        w, s, P = self.window, self.window.s, self.window.behind_lag
        steps = np.full(len(r.error), w.step)
        steps[0] /= 2.0  # the trapezoid: after a setpoint step the error begins at 1
        total = float(steps @ np.abs(r.error))
        g = w.back(steps * _signs(r)) * w.unit_step
        proportional, derivative = r.Kp * r.slow, r.Kp * s * r.Td * r.slow
        integral = r.ki / s * r.slow
        turn = s * r.Td / self.ratio
        controller = proportional + integral + derivative
        # d log F/d log Td = -(s Tf + (s Tf)^2) F
        by = [proportional + derivative, integral, derivative - controller * (turn + turn**2) * r.slow][: len(x)]
        if self.goal == "load":
            inner = -g * w.plant * P / r.back**2
            slopes = [float((inner * d).real.sum()) for d in by]
        else:
            # e = (1 - P (Kp b + ki/s)/(1 + L))/s
            inner = g * P**2 * (r.Kp * r.b + r.ki / s) / r.back**2
            slopes = [float((inner * d).real.sum()) for d in by]
            direct = -g * P / r.back
            slopes[0] += float((direct * r.Kp * r.b).real.sum())
            slopes[1] += float((direct * r.ki / s).real.sum())
        return float(np.log(total)), np.array(slopes) / total

    def cut_off(self, x: Floats) -> float:
        """How much of the response lies above the window's frequencies, about: abs(Y) w at its end."""
        if self.window.sampled:
            return 0.0
        return float(abs(self.window.plant[-1])) * (1.0 if self.goal == "load" else float(np.exp(x[0])))

    def response(self, x: Floats) -> Response:
        """The error in time, with the best setpoint weight."""
        w, s = self.window, self.window.s
        Kp, ki = float(np.exp(x[0])), float(np.exp(x[1]))
        Td = float(np.exp(x[2])) if len(x) == 3 else 0.0
        turn = s * Td / self.ratio
        slow = 1.0 / (1.0 + turn + turn**2 / 2.0)
        back = 1.0 + w.behind_lag * slow * (Kp * (1.0 + s * Td) + ki / s)
        if self.goal == "load":
            return Response(w.in_time(w.plant / back * w.unit_step), 1.0, None, Kp, ki, Td, slow, back)
        answer = w.behind_lag / back * w.unit_step
        # The jump of the error at 0 is taken out as a decay, long against the steps: the sum has no jump to follow.
        tau = w.step * len(w.w) / 15.0
        decay = w.step / (1.0 - np.exp(-1j * w.w * w.step - w.step / tau)) if w.sampled else tau / (1.0 + s * tau)
        without = w.in_time(w.unit_step - answer * ki / s - decay) + np.exp(-w.time / tau)
        gained = w.in_time(answer * Kp)
        b = _best_weight(without, gained)
        return Response(without - b * gained, b, gained, Kp, ki, Td, slow, back)


def _signs(r: Response) -> Floats:
    signs = np.sign(r.error)
    if r.gained is not None and 0.0 < r.b < 1.0:
        # At the best weight one sample of the error is 0: its sign is what makes the slope in b vanish.
        one = int(np.argmin(np.abs(r.error[1:]))) + 1
        signs[one] = 0.0
        signs[one] = np.clip(-float(signs @ r.gained) / r.gained[one], -1.0, 1.0)
    return np.asarray(signs, dtype=np.float64)


def _best_weight(without: Floats, gained: Floats) -> float:
    """b in 0..1 with the least sum of abs(without - b gained): a median of their ratio, weighted."""
    size = np.abs(gained)
    some = size > 1e-9 * size.max()
    ratio = without[some] / gained[some]
    order = np.argsort(ratio)
    weight = np.cumsum(size[some][order])
    return float(np.clip(ratio[order][np.searchsorted(weight, weight[-1] / 2.0)], 0.0, 1.0))


def find_iae(band: Band, settings: PidSettings, goal: str, ratio: float) -> Iae:
    """IAE over a window in which given settings (of a stable loop) have settled.

    Raises Refused not-simulated where that takes too long, as for a plant that rings far above the loop.
    """
    turning = band.turning
    top = TOP * turning
    if settings.Td > 0:
        top = max(top, 4.0 / settings.Td)
    free = [abs(settings.Kp), settings.ki] + ([settings.Td] if settings.Td > 0 else [])
    x = np.log(free)
    duration = 8.0 * (settings.Ti + np.pi / turning)
    while True:
        found = Iae(make_window(band.source, band.sign, duration, top), goal, ratio)
        if len(found.window.w) > LONGEST:
            break
        error = np.abs(found.response(x).error)
        if found.cut_off(x) > CUT_OFF * error.max():
            top *= 3.0
        elif error[-len(error) // 4 :].max() > SETTLED * error.max():
            duration *= 2.0
        else:
            return found
    raise Refused(
        "not-simulated",
        'The response of this plant is too long to be followed: use goal="integral", which needs no simulation.',
    )
