"""Climb: from stable settings to the largest ki nearby, under the limit on abs(S) and abs(T).

log ki is maximised by sequential quadratic programming (scipy's SLSQP, analytic gradients) with one constraint
abs(L + c) >= r per frequency and circle (see largest_ki), in steps small enough not to jump over a circle;
frequencies where the loop still peaks above the limit join the grid until none is left.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import Bounds, minimize

from ident.loop.margins import complementary, sensitivity
from ident.loop.nyquist import is_stable
from ident.loop.settings import PidSettings
from ident.loop.sweep import OpenLoop, sweep
from ident.tune.band import Band
from ident.tune.ellipses import FILTER, circles

Floats = NDArray[np.float64]

CLIMBS = 40
REACH = 0.3  # log: how far one climb may move each setting
NEAR = 1.6  # constraints further than this times the radius cannot become active within one climb
EXCESS, GAIN = 1e-7, 1e-7  # relative: left above the limit, and of ki per climb, where the climb ends


def climb(band: Band, M: float, start: PidSettings) -> PidSettings | None:
    """PID settings (PI where start.Td is 0) with the largest ki around a start; None where the climb fails.

    start   for a plant of positive sign; what is returned has the plant's own
    """
    free = [start.Kp, start.ki] if start.Td == 0 else [start.Kp, start.ki, start.Td]
    x = np.log(free)
    reach = REACH
    best: PidSettings | None = None
    for _ in range(CLIMBS):
        tried = _step(band, M, x, reach)
        settings = _settings(band, tried)
        run = sweep(OpenLoop(band.source, settings))
        if not is_stable(run):
            reach /= 3.0
            if reach < 1e-4:
                break
            continue
        moved = float(np.max(np.abs(tried - x)))
        x = tried
        peaks = [sensitivity(run), complementary(run)]
        if max(p.supremum for p in peaks) <= M * (1.0 + EXCESS):
            if best is not None and settings.ki < best.ki * (1.0 + GAIN):
                return max(best, settings, key=lambda s: s.ki)
            best = settings
            if moved < 1e-9:
                return best
        else:
            band = band.with_points(np.concatenate([p.w[p.height > M] for p in peaks]))
    return best


def _three(x: Floats) -> Floats:
    values = np.zeros(3)
    values[: len(x)] = np.exp(x)
    return values


def _settings(band: Band, x: Floats) -> PidSettings:
    Kp, ki, Td = (float(v) for v in _three(x))
    return PidSettings(band.sign * Kp, Kp / ki, Td, Td / FILTER)


def _step(band: Band, M: float, x: Floats, reach: float) -> Floats:
    """One climb of at most `reach` from x = log (Kp, ki, Td), or log (Kp, ki) for a PI."""
    distances, _ = _constraints(band.w, band.plant, M, x)
    near = (distances < NEAR - 1.0).any(axis=0)
    w, plant = band.w[near], band.plant[near]
    limit = np.array([np.inf, np.inf, np.log(band.residence)] if len(x) == 3 else [np.inf, np.inf])
    x = np.minimum(x, limit)
    found = minimize(  # type: ignore[call-overload]  # the stubs do not know the keys of a constraint
        _objective,
        x,
        jac=True,
        method="SLSQP",
        bounds=Bounds(x - reach, np.minimum(x + reach, limit)),
        constraints={
            "type": "ineq",
            "fun": lambda z: _constraints(w, plant, M, z)[0].ravel(),
            "jac": lambda z: _constraints(w, plant, M, z)[1].reshape(-1, len(z)),
        },
        options={"maxiter": 60, "ftol": 1e-13},
    )
    return np.asarray(found.x, dtype=np.float64)


def _objective(x: Floats) -> tuple[float, Floats]:
    return -float(x[1]), np.eye(len(x))[1] * -1.0


def _constraints(w: Floats, plant: NDArray[np.complex128], M: float, x: Floats) -> tuple[Floats, Floats]:
    """abs(L + c)/r - 1 per circle and frequency, (2, n), and its gradient in x, (2, n, len(x))."""
    Kp, ki, Td = _three(x)
    s = 1j * w
    Tf = Td / FILTER
    slow = 1.0 / (1.0 + s * Tf + (s * Tf) ** 2 / 2.0)
    filtered = plant * slow
    integral, derivative = filtered * ki / s, filtered * Kp * s * Td
    proportional = filtered * Kp
    loop = proportional + integral + derivative
    # d log F/d log Td = -(s Tf + (s Tf)^2) F
    by = np.stack([proportional + derivative, integral, derivative - loop * (s * Tf + (s * Tf) ** 2) * slow], -1)
    by = by[:, : len(x)]
    values, slopes = [], []
    for c, r in circles(M):
        away = loop + c
        size = np.abs(away)
        values.append(size / r - 1.0)
        slopes.append((np.conj(away)[:, None] * by).real / (size * r)[:, None])
    return np.stack(values), np.stack(slopes)
