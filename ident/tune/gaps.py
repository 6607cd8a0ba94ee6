"""Where to start: a coarse search over Kp that knows every gap between the forbidden ellipses.

With derivative action, or on a plant that resonates, the allowed ki at a given Kp need not start at 0: each
frequency forbids an interval of ki (see largest_ki), and what remains are the gaps between them. The best ki is
the top of the highest gap in which the loop is stable, which a turn count on the grid tells.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ident.loop.settings import PidSettings
from ident.tune.band import Band
from ident.tune.ellipses import FILTER, circles, largest_gain

Floats = NDArray[np.float64]

EVERY = 3  # of the band's frequencies: a start need not be exact
GAINS, LOWEST, HIGHEST = 40, 0.01, 5.0  # grid over Kp, in terms of the gain that a circle allows without ki
DEEPEST = 6  # gaps looked into from the top


def best_in_gaps(band: Band, M: float, Td: float) -> PidSettings | None:
    """Stable settings near the best ki at a given Td (Tf = Td/10), sign of the plant taken out; None: no gap."""
    w, plant = band.w[::EVERY], band.plant[::EVERY]
    s = 1j * w
    Tf = Td / FILTER
    filtered = plant / (1.0 + s * Tf + (s * Tf) ** 2 / 2.0)
    inverse = 1.0 / filtered
    top = min(largest_gain(inverse / (1.0 + s * Td), c, r) for c, r in circles(M))
    if not np.isfinite(top):
        return None
    Kp = top * np.geomspace(LOWEST, HIGHEST, GAINS)
    low, high = _forbidden(w, inverse, Kp, Td, M)
    order = np.argsort(low, axis=1)
    low, high = np.take_along_axis(low, order, 1), np.take_along_axis(high, order, 1)
    covered = np.maximum.accumulate(np.column_stack([np.zeros(len(Kp)), high[:, :-1]]), axis=1)
    gap = np.isfinite(low) & (low > covered)
    best: tuple[float, float] | None = None
    for _ in range(DEEPEST):
        rows = np.flatnonzero(gap.any(axis=1))
        last = low.shape[1] - 1 - np.argmax(gap[rows, ::-1], axis=1)
        # A little inside the gap, where the turn count is clear of the edge.
        ki = 0.98 * low[rows, last] + 0.02 * covered[rows, last]
        C = Kp[rows, None] * (1.0 + s * Td) + ki[:, None] / s
        stable = _stable(filtered * C)
        for k in np.flatnonzero(stable):
            if best is None or ki[k] > best[1]:
                best = float(Kp[rows[k]]), float(ki[k])
        gap[rows, last] = False
        gap[rows[stable]] = False
        if not gap.any():
            break
    return PidSettings(best[0], best[0] / best[1], Td, Tf) if best else None


def _forbidden(w: Floats, inverse: NDArray[np.complex128], Kp: Floats, Td: float, M: float) -> tuple[Floats, Floats]:
    """(gains, 2n) lower and upper ends of the ki that each frequency and circle forbids; inf, -inf where none."""
    lows, highs = [], []
    for c, r in circles(M):
        half = (r * np.abs(inverse)) ** 2 - (Kp[:, None] + c * inverse.real) ** 2
        root = np.sqrt(np.maximum(half, 0.0))
        middle = c * inverse.imag + Kp[:, None] * (w * Td)
        some = (half > 0) & (middle + root > 0)
        lows.append(np.where(some, w * (middle - root), np.inf))
        highs.append(np.where(some, w * (middle + root), -np.inf))
    return np.hstack(lows), np.hstack(highs)


def _stable(loop: NDArray[np.complex128]) -> NDArray[np.bool_]:
    """Turn count per row (see ident.loop.nyquist), for loops that start with the real part of 1 + L above 0."""
    from_minus_one = 1.0 + loop
    turns = np.angle(from_minus_one[:, 1:] / from_minus_one[:, :-1])
    above = np.abs(loop) >= 1.0
    # Turns count up to the first point after the last one with abs(L) >= 1.
    after = np.cumsum(above[:, ::-1], axis=1)[:, ::-1] > 0
    turned = np.angle(from_minus_one[:, 0]) + np.sum(turns * after[:, :-1], axis=1)
    return np.asarray((np.abs(turned) < 0.75 * np.pi) & ~above[:, -1])
