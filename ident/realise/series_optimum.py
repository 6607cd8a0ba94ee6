"""The largest integral gain that a network with real zeros and its own filter pole can have under a target."""

from __future__ import annotations

import numpy as np

from ident.errors import Refused
from ident.realise.forms import Series
from ident.realise.grid import Floats, Grid, largest_gain

ROUNDS, SIDE = 4, 24


def series_optimum(on: Grid, target: float, *, N: float | None, room: float = 1.0) -> Series:
    """Kc (> 0), tauI, tauD of Kc (1 + 1/(s tauI)) (1 + s tauD)/(1 + s tauD/N), tauD <= tauI; PI where N is None.

    target  of max(Ms, Mt);  room  share of the largest gain that is used
    A grid over both times, drawn in round its best point; the gain of each point is exact on the grid of frequencies.
    Raises Refused unbounded.
    """
    tauI = np.geomspace(0.1 / on.w[-1], 20.0 / on.w[0], 2 * SIDE)
    ratio = np.array([0.0]) if N is None else np.concatenate(([0.0], np.geomspace(0.01, 1.0, SIDE)))
    best = (0.0, 0.0, 0.0)
    for _ in range(ROUNDS):
        gain = _gains(on, tauI, ratio, target, N)
        if np.isinf(gain).any():
            raise Refused(
                "unbounded",
                "This plant would take any gain: noise and the amplifier are what limits it. Give the dead time or "
                "lag that the log does not show.",
            )
        ki = gain / tauI[:, None]
        i, j = divmod(int(np.argmax(ki)), ki.shape[1])
        best = (float(gain[i, j]), float(tauI[i]), float(ratio[j]))
        tauI = np.geomspace(tauI[max(i - 1, 0)], tauI[min(i + 1, len(tauI) - 1)], SIDE)
        if len(ratio) > 1:
            ratio = np.linspace(ratio[max(j - 1, 0)], ratio[min(j + 1, len(ratio) - 1)], SIDE)
    return Series(room * best[0], best[1], best[1] * best[2])


def _gains(on: Grid, tauI: Floats, ratio: Floats, target: float, N: float | None) -> Floats:
    s = 1j * on.w
    integral = on.plant * (1.0 + 1.0 / (s * tauI[:, None]))  # (m, w)
    rows = []
    for share in ratio:  # one row of tauI at a time keeps the arrays in the cache
        tauD = share * tauI[:, None]
        shape = integral * (1.0 + s * tauD) / (1.0 + s * tauD / N) if N else integral
        rows.append(largest_gain(shape, target))
    return np.stack(rows, axis=1)
