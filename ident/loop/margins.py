"""Margins of a loop: stability by Nyquist count, then Ms, Mt, gain, phase and delay margin."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ident.loop.controller import Controller
from ident.loop.held_plant import Complex, held_plant
from ident.loop.nyquist import is_stable
from ident.loop.sweep import Floats, OpenLoop, Sweep, sweep
from ident.loop.zoom import maxima, roots


@dataclass(frozen=True, slots=True)
class Margins:
    """Robustness of a closed loop.

    stable            from the Nyquist count; where False the other fields are None
    Ms, Mt            suprema of abs(S) and abs(T(s))
    gain_margin       factor; None (with stable True) where no gain makes the loop unstable
    phase_margin_deg  degrees; None where abs of the loop never crosses 1
    delay_margin_s    s; None likewise
    """

    stable: bool
    Ms: float | None
    Mt: float | None
    gain_margin: float | None
    phase_margin_deg: float | None
    delay_margin_s: float | None


Mask = NDArray[np.bool_]
ROUNDING = 1e-13
UNSTABLE = Margins(False, None, None, None, None, None)


@dataclass(frozen=True, slots=True, eq=False)
class Peaks:
    """Local maxima of abs(S) or abs(T): where, how high, and the supremum with both ends of the axis."""

    w: Floats
    height: Floats
    supremum: float


def margins(plant: Any, settings: Controller, *, period: float = 0.0, compute_delay: float = 0.0) -> Margins:
    """Robustness of plant and controller in one loop, P C F exp(-s (period/2 + compute_delay)).

    plant          a fit, a model, or anything with frequency_response(w), taken to be stable or integrating;
                   one with a sample time `h` holds its own sampling: only compute_delay is added
    period         controller sample time, s, 0 for analogue;  compute_delay  s
    The phase margin is the smallest abs over all gain crossovers; the delay margin the least delay that
    brings any of them to -1; the gain margin the smallest factor above 1. Suprema count w -> 0 and w -> inf.
    Raises Refused: period-out-of-range, plant-without-response, plant-response-unusable,
    low-frequency-unclear.
    """
    return loop_margins(OpenLoop(held_plant(plant, period, compute_delay), settings))


def loop_margins(loop: OpenLoop) -> Margins:
    """The same of a loop as it stands."""
    run = sweep(loop)
    if not is_stable(run):
        return UNSTABLE
    phase_margin, delay_margin = _phase_and_delay(run)
    return Margins(
        True,
        sensitivity(run).supremum,
        complementary(run).supremum,
        _gain_margin(run),
        phase_margin,
        delay_margin,
    )


def sensitivity(run: Sweep) -> Peaks:
    """Peaks of abs(S) of a stable loop."""
    at_ends = [abs(1.0 / (1.0 + run.gain))] if run.order == 0 else []
    at_ends.append(1.0 / (1.0 - run.tail) if run.end is None else abs(1.0 / (1.0 + run.end)))
    return _peaks(run, lambda _, loop: 1.0 / np.abs(1.0 + loop), at_ends)


def complementary(run: Sweep) -> Peaks:
    """Peaks of abs(T) of a stable loop; integral action makes T(0) = 1."""
    at_ends = [abs(run.gain / (1.0 + run.gain)) if run.order == 0 else 1.0 if run.order > 0 else 0.0]
    at_ends.append(run.tail / (1.0 - run.tail) if run.end is None else abs(run.end / (1.0 + run.end)))
    return _peaks(run, lambda _, loop: np.abs(loop / (1.0 + loop)), at_ends)


def control_sensitivity(run: Sweep, settings: Controller) -> Peaks:
    """Peaks of abs(C F S): by how much the command answers to measurement noise, command unit per speed unit."""
    return _peaks(run, lambda w, loop: np.abs(settings.frequency_response(w) / (1.0 + loop)), [])


def _peaks(run: Sweep, size: Callable[[Floats, Complex], Floats], at_ends: list[float]) -> Peaks:
    values = size(run.w, run.loop)
    inner, floor = values[1:-1], values[1:-1] * (1.0 - ROUNDING)
    rise = (inner >= values[:-2]) & (inner >= values[2:]) & ((floor > values[:-2]) | (floor > values[2:]))
    # Neighbours are so close in angle that a bump this much lower cannot hide the highest peak.
    bumps = np.flatnonzero(rise & (inner > 0.93 * values.max())) + 1
    w, height = maxima(lambda w: size(w, run.evaluate(w)), run.w[bumps - 1], run.w[bumps + 1])
    return Peaks(w, height, float(max([*at_ends, *height, values[-1]])))


def _crossings(run: Sweep, function: Callable[[Complex], Floats], among: Mask | None = None) -> Floats:
    values = function(run.loop)
    change = np.sign(values[1:]) != np.sign(values[:-1])
    at = np.flatnonzero(change if among is None else change & among)
    return roots(lambda w: function(run.evaluate(w)), run.w[at], run.w[at + 1])


def _phase_and_delay(run: Sweep) -> tuple[float | None, float | None]:
    w = _crossings(run, lambda loop: np.log(np.abs(loop)))
    # A settled tail above 1 meets any delay, however small, at some high enough frequency.
    fragile = [0.0] if run.open_ended and run.tail >= 1 else []
    if len(w) == 0:
        return None, (0.0 if fragile else None)
    lag = np.angle(-run.evaluate(w))
    delays = np.mod(lag, 2.0 * np.pi) / w
    return float(np.degrees(np.min(np.abs(lag)))), float(min([*delays, *fragile]))


def _gain_margin(run: Sweep) -> float | None:
    size, left = np.abs(run.loop), run.loop.real < 0
    crossing = (left[1:] | left[:-1]) & (np.sign(run.loop.imag[1:]) != np.sign(run.loop.imag[:-1]))
    # Delay crosses without end; only the crossings nearest below 1 decide.
    below = np.minimum(size[1:], size[:-1])[crossing]
    nearest = max(below[below < 1], default=0.0)
    w = _crossings(run, lambda loop: loop.imag, crossing & (np.maximum(size[1:], size[:-1]) >= 0.8 * nearest))
    at: Complex = run.evaluate(w)
    sizes = [*np.abs(at[at.real < 0])]
    if run.end is None:
        sizes.append(run.tail)
    elif run.end.real < 0 and abs(run.end.imag) < 1e-3 * abs(run.end):
        sizes.append(-run.end.real)
    factors = [1.0 / size for size in sizes if 0 < size < 1]
    return float(min(factors)) if factors else None
