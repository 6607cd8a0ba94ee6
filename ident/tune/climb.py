"""Climb: from stable settings to the best ones nearby, under the limits on abs(S), abs(T) and abs(C F S).

log ki is maximised, or another objective made least, by sequential quadratic programming (scipy's SLSQP, exact
gradients) with one constraint abs(L + c) >= r per frequency and circle (see largest_ki), in steps small enough not to
jump over a circle; frequencies where the loop still peaks above a limit join the grid until none is left.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import Bounds, minimize

from ident.loop.margins import complementary, control_sensitivity, sensitivity
from ident.loop.nyquist import is_stable
from ident.loop.settings import PidSettings
from ident.loop.sweep import OpenLoop, sweep
from ident.tune.band import Band
from ident.tune.ellipses import Limits

Floats = NDArray[np.float64]
# x = log (Kp, ki[, Td]), the plant's sign taken out, to a value to be made least and its gradient.
Objective = Callable[[Floats], tuple[float, Floats]]

CLIMBS = 40
REACH = 0.3  # log: how far one climb may move each setting
NEAR = 1.6  # constraints further than this times the radius cannot become active within one climb
PRECISION = 1e-7  # of the objective, a logarithm: less gained by one climb ends it


def most_ki(x: Floats) -> tuple[float, Floats]:
    """The largest integral gain, as something to be made least."""
    return -float(x[1]), np.eye(len(x))[1] * -1.0


def climb(
    band: Band,
    limits: Limits,
    start: PidSettings,
    objective: Objective = most_ki,
    precision: float = PRECISION,
) -> PidSettings | None:
    """PID settings (PI where start.Td is 0) with the best objective around a start; None where the climb fails.

    start      for a plant of positive sign; what is returned has the plant's own
    precision  relative, of the objective, and left above a limit
    """
    free = [start.Kp, start.ki] if start.Td == 0 else [start.Kp, start.ki, start.Td]
    x = np.log(free)
    reach = REACH
    best: tuple[float, PidSettings] | None = None
    for _ in range(CLIMBS):
        tried = _step(band, limits, x, reach, objective, precision)
        settings = _settings(band, tried, limits)
        run = sweep(OpenLoop(band.source, settings))
        if not is_stable(run):
            reach /= 3.0
            if reach < 1e-4:
                break
            continue
        moved = float(np.max(np.abs(tried - x)))
        x = tried
        peaks = [(sensitivity(run), limits.M), (complementary(run), limits.M)]
        beyond: list[Floats] = []
        if limits.noise is not None:
            peaks.append((control_sensitivity(run, settings), limits.noise))
            beyond = [run.w[-1:]]  # where a PI may answer the most
        if all(p.supremum <= limit * (1.0 + precision) for p, limit in peaks):
            value = objective(x)[0]
            if best is not None and value > best[0] - precision:
                return min(best, (value, settings), key=lambda found: found[0])[1]
            best = value, settings
            if moved < 1e-9:
                return settings
        else:
            band = band.with_points(np.concatenate([p.w[p.height > limit] for p, limit in peaks] + beyond))
    return best[1] if best else None


def _three(x: Floats) -> Floats:
    values = np.zeros(3)
    values[: len(x)] = np.exp(x)
    return values


def _settings(band: Band, x: Floats, limits: Limits) -> PidSettings:
    Kp, ki, Td = (float(v) for v in _three(x))
    return PidSettings(band.sign * Kp, Kp / ki, Td, Td / limits.ratio)


def _step(band: Band, limits: Limits, x: Floats, reach: float, objective: Objective, precision: float) -> Floats:
    """One climb of at most `reach` from x = log (Kp, ki, Td), or log (Kp, ki) for a PI."""
    distances, _ = _constraints(band.w, band.plant, limits, x)
    near = (distances < NEAR - 1.0).any(axis=0)
    w, plant = band.w[near], band.plant[near]
    limit = np.array([np.inf, np.inf, np.log(band.residence)] if len(x) == 3 else [np.inf, np.inf])
    x = np.minimum(x, limit)
    found = minimize(  # type: ignore[call-overload]  # the stubs do not know the keys of a constraint
        objective,
        x,
        jac=True,
        method="SLSQP",
        bounds=Bounds(x - reach, np.minimum(x + reach, limit)),
        constraints={
            "type": "ineq",
            "fun": lambda z: _constraints(w, plant, limits, z)[0].ravel(),
            "jac": lambda z: _constraints(w, plant, limits, z)[1].reshape(-1, len(z)),
        },
        options={"maxiter": 60 if objective is most_ki else 25, "ftol": 10.0 * precision**2},
    )
    return np.asarray(found.x, dtype=np.float64)


def _constraints(w: Floats, plant: NDArray[np.complex128], limits: Limits, x: Floats) -> tuple[Floats, Floats]:
    """abs(L + c)/r - 1 per circle and frequency, (2, n), and its gradient in x, (2, n, len(x)).

    With a limit on noise a third row, noise abs(1 + L)/abs(C F) - 1.
    """
    Kp, ki, Td = _three(x)
    s = 1j * w
    Tf = Td / limits.ratio
    slow = 1.0 / (1.0 + s * Tf + (s * Tf) ** 2 / 2.0)
    proportional, integral, derivative = Kp * slow, ki / s * slow, Kp * s * Td * slow
    controller = proportional + integral + derivative
    # d log F/d log Td = -(s Tf + (s Tf)^2) F
    by = np.stack([proportional + derivative, integral, derivative - controller * (s * Tf + (s * Tf) ** 2) * slow], -1)[
        :, : len(x)
    ]
    loop = plant * controller
    values, slopes = [], []
    for c, r in limits.circles:
        away = loop + c
        size = np.abs(away)
        values.append(size / r - 1.0)
        slopes.append((np.conj(away)[:, None] * plant[:, None] * by).real / (size * r)[:, None])
    if limits.noise is not None:
        value = limits.noise * np.abs(1.0 + loop) / np.abs(controller)
        values.append(value - 1.0)
        # d log(1 + L) - d log C
        relative = plant[:, None] * by / (1.0 + loop)[:, None] - by / controller[:, None]
        slopes.append(value[:, None] * relative.real)
    return np.stack(values), np.stack(slopes)
