"""Nyquist: is the closed loop stable? Turns of 1 + L around the origin, the arc around s = 0 included."""

from __future__ import annotations

import numpy as np

from ident.loop.sweep import Sweep


def is_stable(sweep: Sweep) -> bool:
    """Whether a loop of a plant without unstable poles closes to a stable one (Nyquist 1932).

    The contour passes integrators, L ~ gain/s^order, on the right: there 1 + L turns from the positive real
    axis by -order 90 degrees before w = 0+. The loop is stable if, all turns added, 1 + L ends where it
    began, on the positive real axis. Once abs(L) stays below 1, Re(1 + L) > 0 and no more turns can follow;
    a tail that stays at or above 1 while delay turns it encircles -1 for ever.
    """
    if (sweep.order > 0 and sweep.gain <= 0) or (sweep.order == 0 and sweep.gain <= -1):
        return False  # 1 + L changes sign along the positive real axis: a real unstable pole
    if sweep.tail >= 1 and (sweep.end is None or not sweep.open_ended):
        return False  # turned for ever, or a crossover beyond what a sampled model knows
    from_minus_one = 1.0 + sweep.loop
    if not from_minus_one.all():
        return False
    if sweep.tail < 1:
        above = np.flatnonzero(np.abs(sweep.loop) >= 1)
        if len(above) == 0:
            return True
        from_minus_one = from_minus_one[: above[-1] + 2]
    order = max(sweep.order, 0)
    start = -order * np.pi / 2 + float(np.angle(from_minus_one[0] * 1j**order))
    turned = start + float(np.sum(np.angle(from_minus_one[1:] / from_minus_one[:-1])))
    return abs(turned) < np.pi * 0.75
