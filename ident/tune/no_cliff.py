"""The PID without the derivative cliff: the most derivative action with the limit touched at one frequency.

At a fixed derivative gain kd = Kp Td the largest ki is where the lowest edge of all ellipses is highest. With little
kd that is the bottom of one ellipse: the loop touches the limit at one frequency, and a change of kd costs little. With
much kd it is the corner between two ellipses: ki still grows with kd, but the margin falls steeply (the cliff) where
the derivative is a little more than meant. The settings here have the largest kd of the first kind (Astrom and
Hagglund 2004, J. Process Control 14, 635-650; Panagopoulos, Astrom and Hagglund 2002, IEE Proc. CTA 149, 32-40).
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ident.loop.nyquist import is_stable
from ident.loop.settings import PidSettings
from ident.loop.sweep import OpenLoop, sweep
from ident.tune.band import Band
from ident.tune.ellipses import Limits
from ident.tune.largest_ki import best_on_grid, lower_edges, missing

HALVINGS = 12
LEAST = 0.02  # of the unrestricted derivative gain, where the search begins
ASIDE = 2e-3  # of Kp: where the touching frequencies on both sides of the best gain are read
ONE = 0.1  # log: frequencies closer than this are one
EXCHANGES = 15


def no_cliff(band: Band, limits: Limits, free: PidSettings) -> PidSettings | None:
    """Settings with the largest kd at which the limit is touched at one frequency; free: those of the largest ki.

    None where the search does not bring such settings. Limits on noise are not known here.
    """
    most = abs(free.Kp) * free.Td
    low, high = LEAST * most, most
    settings, single = _at(band, limits, low, free)
    if not single:
        return None
    if _at(band, limits, high, free)[1]:
        return None  # the unrestricted optimum has no cliff
    for _ in range(HALVINGS):
        middle = float(np.sqrt(low * high))
        tried, single = _at(band, limits, middle, settings)
        low, high, settings = (middle, high, tried) if single else (low, middle, settings)
    return _within(band, limits, low, settings)


def _at(band: Band, limits: Limits, kd: float, near: PidSettings) -> tuple[PidSettings, bool]:
    """The largest ki on the band's frequencies at this kd, and whether one frequency decides it.

    near   settings whose gain tells the filter time; it follows as the search closes in
    """
    filtered, Tf = _filtered(band, kd / abs(near.Kp) / limits.ratio)
    Kp, ki = best_on_grid(filtered, limits, None, kd)
    if not 0 < ki < np.inf:
        return near, False
    inverse = 1.0 / filtered.plant
    ellipses = np.hstack(
        [
            (band.w, c * inverse.real, c * inverse.imag + kd * band.w, (r * np.abs(inverse)) ** 2)
            for c, r in limits.circles
        ]
    )
    edges = lower_edges(ellipses, Kp * np.array([1.0 - ASIDE, 1.0 + ASIDE]))
    at = ellipses[0][np.argmin(edges, axis=1)]
    return PidSettings(Kp, Kp / ki, kd / Kp, Tf), bool(abs(np.log(at[1] / at[0])) < ONE)


def _filtered(band: Band, Tf: float) -> tuple[Band, float]:
    turn = 1j * band.w * Tf
    return replace(band, plant=band.plant / (1.0 + turn + turn**2 / 2.0)), Tf


def _within(band: Band, limits: Limits, kd: float, settings: PidSettings) -> PidSettings | None:
    """The same on a grid that misses no peak."""
    for _ in range(EXCHANGES):
        filtered, Tf = _filtered(band, kd / abs(settings.Kp) / limits.ratio)
        Kp, ki = best_on_grid(filtered, limits, abs(settings.Kp), kd)
        if not 0 < ki < np.inf:
            return None
        settings = PidSettings(band.sign * Kp, Kp / ki, kd / Kp, Tf)
        run = sweep(OpenLoop(band.source, settings))
        if not is_stable(run):
            return None
        wanting = missing(run, limits.M)
        if wanting is None:
            # Tf follows the gain by less than anyone can set.
            return settings
        band = band.with_points(wanting)
    return None
