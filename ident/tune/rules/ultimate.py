"""The ultimate gain and period: where a proportional controller makes the loop oscillate."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from ident.errors import Refused
from ident.loop.held_plant import HeldPlant, held_plant
from ident.loop.zoom import roots


@dataclass(frozen=True, slots=True)
class Ultimate:
    """Ku, command unit per speed unit, of the plant's sign; Pu, s."""

    Ku: float
    Pu: float


def ultimate(plant: Any, *, period: float = 0.0, compute_delay: float = 0.0) -> Ultimate:
    """The gain at which the phase of the plant, hold and computing delay included, is -180 degrees.

    Raises Refused no-ultimate-gain for a plant that never turns that far.
    """
    held = held_plant(plant, period, compute_delay)
    w = _scan(held)
    response = held(w)
    sign = float(np.sign(response[0].real)) or 1.0
    lag = -np.unwrap(np.angle(sign * response))
    past = np.flatnonzero(lag >= np.pi)
    if len(past) == 0 or past[0] == 0:
        raise Refused("no-ultimate-gain", "This plant never lags 180 degrees: no gain makes its loop oscillate.")
    k = int(past[0])
    at = roots(lambda x: (sign * held(x)).imag, w[k - 1 : k], w[k : k + 1])
    return Ultimate(sign / float(abs(held(at)[0])), float(2.0 * np.pi / at[0]))


def _scan(held: HeldPlant) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    centre = 1.0 / held.known_delay if held.known_delay > 0 else 1.0
    return np.geomspace(centre * 1e-4, min(centre * 1e4, held.w_max), 1600)
