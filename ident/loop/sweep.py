"""Sweep: a loop transfer function along frequency, fine enough to count turns and to bracket every peak."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused
from ident.loop.controller import Controller
from ident.loop.held_plant import Complex, HeldPlant

Floats = NDArray[np.float64]

COARSE_PER_DECADE = 20
FINE_PER_DECADE = 100
# abs(L) between these bounds is where margins are decided; outside, S is 0 or 1 and the coarse grid will do.
LOUD, QUIET = 1e2, 1e-6
DELAY_STEP = 0.1  # rad of delay phase per point
DELAY_TURNS = 2000.0  # rad of delay phase that are resolved; a loop above 1 for longer is unstable anyway
TURN = 0.2  # rad per point of L, and of 1 + L twice that
APART = 1e-6  # relative; closer neighbours would bracket nothing but rounding
STEP = 0.2  # neper per point


@dataclass(frozen=True, slots=True, eq=False)
class OpenLoop:
    """L(jw) = P C F exp(-jw lag)."""

    plant: HeldPlant
    settings: Controller

    def __call__(self, w: Floats) -> Complex:
        response: Complex = self.plant(w) * self.settings.frequency_response(w)
        return response


@dataclass(frozen=True, slots=True, eq=False)
class Sweep:
    """A loop on a grid, with what it does beyond both ends.

    w, loop       (n,) rad/s increasing, (n,) L(jw)
    order, gain   L -> gain/(jw)^order as w -> 0
    tail          abs(L) as w -> inf: 0 where it vanishes
    open_ended    False where the response ends at a last valid frequency (pi/h)
    end           L as w -> inf (or at the last valid frequency); None where delay keeps turning it
    """

    evaluate: Callable[[Floats], Complex]
    w: Floats
    loop: Complex
    order: int
    gain: float
    tail: float
    end: complex | None
    open_ended: bool


def sweep(loop: OpenLoop) -> Sweep:
    """Evaluate a loop over every frequency that matters.

    The plant is a black box, so the band comes from the response itself: a coarse scan over all decades, a
    fine grid where abs(L) is neither huge nor tiny, linear steps where known delay turns the phase, and
    bisection wherever L or 1 + L still turns or changes too much between neighbours.
    Raises Refused low-frequency-unclear.
    """
    coarse = _all_decades(loop)
    response = loop(coarse)
    order, gain = _start(coarse, response)
    tail, end = _end(loop, float(coarse[-1]))
    size = np.abs(response)
    delay = loop.plant.known_delay

    start = coarse[np.argmax(np.minimum.accumulate(size) < LOUD)]
    band_end = _last(coarse, np.abs(size - tail) > QUIET)
    fine = _per_decade(float(start), max(band_end, float(start) * 10.0), FINE_PER_DECADE)
    focus = _focus(coarse, response, tail, end)
    if delay > 0:
        focus = min(max(focus, 10.0 / delay), DELAY_TURNS / delay)
        first = DELAY_STEP / delay * FINE_PER_DECADE / np.log(10.0)
        fine = np.concatenate([fine, np.arange(first, focus, DELAY_STEP / delay)])
    w = np.sort(np.concatenate([coarse, fine[fine < loop.plant.w_max]]))
    w = w[np.diff(w, prepend=0.0) > APART * w]
    w, response = _bisect(loop, w, loop(w), focus)
    return Sweep(loop, w, response, order, gain, tail, end, bool(np.isinf(loop.plant.w_max)))


def _per_decade(lo: float, hi: float, density: int) -> Floats:
    return np.geomspace(lo, hi, max(2, round(np.log10(hi / lo) * density) + 1))


def _all_decades(loop: OpenLoop) -> Floats:
    s = loop.settings
    times = [t for t in (s.Ti, s.Td, s.Tf, loop.plant.known_delay) if 0 < t < np.inf]
    lo = 1e-5 / max([*times, 1e3])
    hi = min(1e5 / min([*times, 1e-3]), loop.plant.w_max)
    return _per_decade(min(lo, hi * 1e-6), hi, COARSE_PER_DECADE)


def _start(w: Floats, response: Complex) -> tuple[int, float]:
    # One decade apart, so that the slope is the number of integrators.
    slope = -float(np.log10(np.abs(response[COARSE_PER_DECADE] / response[0])))
    if not np.isfinite(slope) or abs(slope - round(slope)) > 0.05:
        raise Refused(
            "low-frequency-unclear",
            f"The loop has no clear slope at {w[0]:.3g} rad/s, so stability cannot be counted; "
            "frequencies must be in rad/s and the plant settled at that frequency.",
        )
    order = round(slope)
    return order, float((response[0] * (1j * w[0]) ** order).real)


def _end(loop: OpenLoop, w: float) -> tuple[float, complex | None]:
    if np.isfinite(loop.plant.w_max):
        last = complex(loop(np.array([w]))[0])
        return abs(last), last
    response = loop(w * np.array([1.0, 0.73, 0.51, 0.37, 0.1]))
    fall = float(np.log10(np.abs(response[-1]) / np.abs(response[0])))
    if fall > 0.05:
        return 0.0, 0j
    if fall < -0.05:
        return np.inf, None
    settled = float(np.ptp(response.real) + np.ptp(response.imag)) < 1e-3 * abs(response[0])
    return abs(response[0]), complex(response[0]) if settled and loop.plant.known_delay == 0 else None


def _last(w: Floats, where: NDArray[np.bool_]) -> float:
    index = np.flatnonzero(where)
    return float(w[index[-1]]) if len(index) else float(w[0])


def _focus(w: Floats, response: Complex, tail: float, end: complex | None) -> float:
    """Frequency above which abs(L) is too small to beat the peaks already seen: |S| <= 1/(1 - |L|)."""
    distance = np.abs(1.0 + response)
    at_end = 1.0 / max(1.0 - tail, 1e-9) if end is None else 1.0 / max(abs(1.0 + end), 1e-9)
    Ms = max(float(np.max(1.0 / np.maximum(distance, 1e-9))), at_end)
    Mt = max(float(np.max(np.abs(response) / np.maximum(distance, 1e-9))), 1.0)
    enough = max(min(1.0 - 1.0 / Ms, Mt / (1.0 + Mt)), 1e-3)
    return _last(w, np.abs(response) > enough * (1.0 + 1e-9)) * 10 ** (1 / COARSE_PER_DECADE)


def _bisect(loop: OpenLoop, w: Floats, response: Complex, focus: float) -> tuple[Floats, Complex]:
    for _ in range(30):
        ratio = response[1:] / response[:-1]
        from_one = (1.0 + response[1:]) / np.where(response[:-1] == -1.0, 1e-300, 1.0 + response[:-1])
        rough = (
            (np.abs(np.angle(ratio)) > TURN)
            | (np.abs(np.log(np.abs(ratio))) > STEP) & (np.abs(response[1:]) < LOUD) & (np.abs(response[:-1]) > QUIET)
            | (np.abs(np.angle(from_one)) > 2 * TURN)
        ) & (w[:-1] < focus)
        if not rough.any() or len(w) > 200_000:
            break
        middle = np.sqrt(w[1:][rough] * w[:-1][rough])
        w = np.concatenate([w, middle])
        sort = np.argsort(w)
        w, response = w[sort], np.concatenate([response, loop(middle)])[sort]
    return w, response
