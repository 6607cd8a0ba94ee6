"""Grid: the plant on the frequencies where a card is decided, and how many cards at once fare on it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused
from ident.loop.held_plant import Complex, held_plant

Floats = NDArray[np.float64]
POINTS = 240
EARLY, LATE = 0.03, 5.0  # rad of lag between which loops come near -1


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """w (n,) rad/s and sign * P(jw) (n,)."""

    w: Floats
    plant: Complex
    sign: float


def grid(plant: Any) -> Grid:
    """Frequencies where a controller for a settled plant is decided. Raises Refused card-needs-settled-plant."""
    held = held_plant(plant)
    delay = held.known_delay
    w = np.geomspace(1e-6, 1e7, 2600)
    w = w[w < held.w_max]
    response = held(w) * np.exp(1j * w * delay)
    lag = -np.unwrap(np.angle(response * np.sign(response[0].real)))
    if abs(response[0].imag) > 0.1 * abs(response[0]):
        raise Refused("card-needs-settled-plant", "Parts are chosen for plants that settle after a command step.")
    lag = lag + w * delay
    start = w[np.argmax(lag > EARLY)] if (lag > EARLY).any() else w[0]
    small = np.abs(response) < 1e-5 * abs(response[0])
    stop_at = (lag > LATE) | small
    stop = w[np.argmax(stop_at)] if stop_at.any() else w[-1]
    chosen = np.geomspace(start, max(stop, 10.0 * start), POINTS)
    chosen = chosen[chosen < held.w_max]
    sign = float(np.sign(response[0].real))
    return Grid(chosen, sign * held(chosen), sign)


def settles(loop: Complex) -> NDArray[np.bool_]:
    """Whether each loop (m, w) of a settled plant and an integrating or leaking card is stable, as the grid shows it.

    1 + L must end, all turns added, on the side where it began (Nyquist 1932); a loop still above 1 where the plant
    lags by LATE is given up.
    """
    from_minus_one = 1.0 + loop
    turned = np.angle(from_minus_one[:, 1:] / from_minus_one[:, :-1]).sum(axis=-1)
    net = np.angle(from_minus_one[:, 0]) + turned
    return np.asarray((np.abs(net) < 0.75 * np.pi) & (np.abs(loop[:, -1]) < 1.0))


def highest_peak(loop: Complex) -> Floats:
    """max(Ms, Mt) seen on the grid, along the last axis; only where the loop settles does it mean anything."""
    distance = np.maximum(np.abs(1.0 + loop), 1e-12)
    return np.asarray((np.maximum(1.0, np.abs(loop)) / distance).max(axis=-1))


def largest_gain(shape: Complex, target: float) -> Floats:
    """The largest k at which k shape, from k = 0 on, keeps abs(S) and abs(T) at most the target; inf: any.

    Both bounds are quadratic in k at each frequency:
    k^2 abs(G)^2 + 2 k Re G + 1 >= 1/M^2  and  k^2 abs(G)^2 (1 - 1/M^2) + 2 k Re G + 1 >= 0.
    """
    size, real = np.abs(shape) ** 2, shape.real
    floor = 1.0 - 1.0 / target**2
    found = np.full(shape.shape[:-1], np.inf)
    for a, c in ((size, floor), (size * floor, 1.0)):
        square = real**2 - a * c
        meets = (square >= 0.0) & (real < 0.0)
        root = c / np.where(meets, -real + np.sqrt(np.maximum(square, 0.0)), 1.0)
        found = np.minimum(found, np.where(meets, root, np.inf).min(axis=-1))
    return found
