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
from ident.tune.ellipses import Limits, largest_gain

Floats = NDArray[np.float64]

EVERY = 3  # of the band's frequencies: a start need not be exact
GAINS, LOWEST, HIGHEST = 40, 0.01, 5.0  # grid over Kp, in terms of the gain that a circle allows without ki
QUIETER = (1.0, 0.5, 0.25, 0.1, 0.04)  # shares of ki that may keep a limit on noise where the gap's top does not
DEEPEST = 6  # gaps looked into from the top


def best_in_gaps(band: Band, limits: Limits, Td: float) -> PidSettings | None:
    """Stable settings near the best ki at a given Td, sign of the plant taken out; None: no gap."""
    Kp, ki = tops(band, limits, Td)
    if len(Kp) == 0:
        return None
    k = int(np.argmax(ki))
    return PidSettings(float(Kp[k]), float(Kp[k] / ki[k]), Td, Td / limits.ratio)


def tops(band: Band, limits: Limits, Td: float, gains: int = GAINS) -> tuple[Floats, Floats]:
    """(Kp, ki) just below the top of the highest stable gap at each of some Kp, at a given Td; sign taken out."""
    w, plant = band.w[::EVERY], band.plant[::EVERY]
    s = 1j * w
    Tf = Td / limits.ratio
    slow = 1.0 / (1.0 + s * Tf + (s * Tf) ** 2 / 2.0)
    filtered = plant * slow
    inverse = 1.0 / filtered
    top = min(largest_gain(inverse / (1.0 + s * Td), c, r) for c, r in limits.circles)
    if limits.noise is not None:
        # Beyond the plant's own frequencies S is 1.
        turn = 1j * np.sqrt(2.0)
        most = abs((1.0 + turn * limits.ratio) / (1.0 + turn + turn**2 / 2.0)) if Td > 0 else 1.0
        top = min(top, limits.noise / most / LOWEST**0.5)
    if not np.isfinite(top):
        return np.empty(0), np.empty(0)
    Kp = top * np.geomspace(LOWEST, HIGHEST, gains)
    low, high = _forbidden(w, inverse, Kp, Td, limits)
    order = np.argsort(low, axis=1)
    low, high = np.take_along_axis(low, order, 1), np.take_along_axis(high, order, 1)
    covered = np.maximum.accumulate(np.column_stack([np.zeros(len(Kp)), high[:, :-1]]), axis=1)
    gap = np.isfinite(low) & (low > covered)
    best = np.zeros(len(Kp))
    for _ in range(DEEPEST):
        rows = np.flatnonzero(gap.any(axis=1))
        last = low.shape[1] - 1 - np.argmax(gap[rows, ::-1], axis=1)
        # A little inside the gap, where the turn count is clear of the edge.
        ki = 0.98 * low[rows, last] + 0.02 * covered[rows, last]
        good = np.zeros(len(rows), dtype=bool)
        for share in (1.0,) if limits.noise is None else QUIETER:
            controller = Kp[rows, None] * (1.0 + s * Td) + share * ki[:, None] / s
            loop = filtered * controller
            fits = _stable(loop) & ~good
            if limits.noise is not None:
                fits &= np.max(np.abs(controller * slow / (1.0 + loop)), axis=1) <= limits.noise
            best[rows[fits]] = share * ki[fits]
            good |= fits
        gap[rows, last] = False
        gap[rows[good]] = False
        if not gap.any():
            break
    return Kp[best > 0], best[best > 0]


def _forbidden(
    w: Floats, inverse: NDArray[np.complex128], Kp: Floats, Td: float, limits: Limits
) -> tuple[Floats, Floats]:
    """(gains, 2n) lower and upper ends of the ki that each frequency and circle forbids; inf, -inf where none."""
    lows, highs = [], []
    for c, r in limits.circles:
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
