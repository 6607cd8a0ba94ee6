"""The PID with the largest integral gain under a limit on abs(S) and abs(T), with Tf = Td/10.

A coarse search over Td and Kp finds the hills, `climb` their tops. This is the unrestricted maximum with Td at
most the average residence time (Panagopoulos, Astrom and Hagglund 2002, IEE Proc. CTA 149, 32-40, discuss why
one may want less derivative action than that).
"""

from __future__ import annotations

import numpy as np

from ident.errors import Refused
from ident.loop.settings import PidSettings
from ident.tune.band import Band
from ident.tune.climb import climb
from ident.tune.ellipses import Limits, not_found
from ident.tune.gaps import best_in_gaps

DERIVATIVES = 24  # grid over Td
SHORTEST = 0.03  # of 1/w where the plant has turned 180 degrees
STARTS = 3


def largest_ki_pid(band: Band, limits: Limits) -> PidSettings:
    """PID settings with the largest ki that keep the loop stable and within the limits.

    Raises Refused: not-offered (an integrating plant bounds no Td), no-settings-found.
    """
    if not np.isfinite(band.residence) or band.residence <= 0:
        raise Refused("not-offered", 'PID settings need a plant that settles: use form="pi" for this one.')
    climbed = [c for c in (climb(band, limits, start) for start in _starts(band, limits)) if c]
    if not climbed:
        raise not_found(limits)
    return max(climbed, key=lambda c: c.ki)


def _starts(band: Band, limits: Limits) -> list[PidSettings]:
    """The best few hills of ki over Td, best first."""
    derivatives = np.geomspace(min(SHORTEST / band.turning, band.residence / 2), band.residence, DERIVATIVES)
    found = [best_in_gaps(band, limits, float(Td)) for Td in derivatives]
    ki = np.array([0.0, *(f.ki if f else 0.0 for f in found), 0.0])
    hills = np.flatnonzero((ki[1:-1] >= ki[:-2]) & (ki[1:-1] >= ki[2:]) & (ki[1:-1] > 0))
    best = sorted(hills, key=lambda k: -ki[k + 1])[:STARTS]
    return [f for f in (found[k] for k in best) if f]
