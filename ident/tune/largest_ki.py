"""The PI with the largest integral gain under a limit on abs(S) and abs(T).

At one frequency both limits keep L = P C out of a circle: abs(L + c) >= r, with c = 1, r = 1/M for S and
c = M^2/(M^2 - 1), r = M/(M^2 - 1) for T. L is linear in Kp and ki, so each circle is an ellipse in the
(Kp, ki) plane, and at a given Kp it allows ki up to its lower edge (Astrom, Panagopoulos and Hagglund
1998, Automatica 34, 585-601). The largest ki over all frequencies is the lowest of these edges: a function of Kp
that costs no plant evaluation at all once P is known on a grid. Frequencies where the loop still peaks above
the limit are added to the grid until none is left (exchange method of semi-infinite programming).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused
from ident.loop.margins import complementary, sensitivity
from ident.loop.nyquist import is_stable
from ident.loop.settings import PidSettings
from ident.loop.sweep import OpenLoop, Sweep, sweep
from ident.tune.band import Band
from ident.tune.climb import climb
from ident.tune.ellipses import Limits, largest_gain, not_found
from ident.tune.gaps import best_in_gaps

Floats = NDArray[np.float64]

GAINS = 60  # grid over Kp
NEARBY = np.linspace(0.85, 1.15, 13)
FURTHER = 30.0  # times the gain that is possible without derivative action
ZOOM, LOOKS = 17, 7  # points of each closer look, between the neighbours of the best
FAR = 1.3  # times the best ki: an ellipse that begins there plays no part in the next look
EXCHANGES = 25
WORTH = 1.002  # a start this much better than what was found is worth climbing from
EXCESS = 1e-7  # relative, left above the limit


def largest_ki(band: Band, limits: Limits) -> PidSettings:
    """PI settings with the largest ki that keep the loop stable and within the limits.

    Raises Refused: unbounded, no-settings-found.
    """
    found = _exchange(band, limits) if limits.noise is None else None
    # On a resonating plant a better answer may lie in a gap above some ellipse.
    start = best_in_gaps(band, limits, 0.0)
    if start and (found is None or start.ki > found.ki * WORTH):
        found = max(filter(None, [climb(band, limits, start), found]), key=lambda s: s.ki, default=None)
    if found is None:
        raise not_found(limits)
    return found


def _exchange(band: Band, limits: Limits) -> PidSettings | None:
    Kp, M = None, limits.M
    for _ in range(EXCHANGES):
        Kp, ki = best_on_grid(band, limits, Kp)
        if not (Kp > 0 and 0 < ki < np.inf):
            break
        settings = PidSettings(band.sign * Kp, Kp / ki)
        run = sweep(OpenLoop(band.source, settings))
        if not is_stable(run):
            # The grid missed a resonance altogether: learn it from the sweep, which follows every turn.
            band = band.with_points(run.w[(np.abs(run.loop) > 0.2) & (np.abs(run.loop) < 20.0)][::2])
            continue
        wanting = missing(run, M)
        if wanting is None:
            return settings
        band = band.with_points(wanting)
    return None


def missing(run: Sweep, M: float) -> Floats | None:
    """Frequencies where a stable loop still exceeds the limit, and about them; None where it does not."""
    peaks = [sensitivity(run), complementary(run)]
    if max(p.supremum for p in peaks) <= M * (1.0 + EXCESS):
        return None
    # With each peak its flanks: a sharp one moves along them as the settings change.
    flanks = run.w[np.abs(1.0 + run.loop) < 1.0 / M]
    return np.concatenate([flanks, *(p.w[p.height > M] for p in peaks)])


def best_on_grid(band: Band, limits: Limits, near: float | None = None, kd: float = 0.0) -> tuple[float, float]:
    """(Kp, ki) with the largest ki over the band's own frequencies; Kp > 0, the plant's sign taken out.

    near    a Kp to look around first, from a grid with fewer frequencies
    kd      derivative gain Kp Td that is kept as it is, its filter in the band's plant
    """
    inverse = 1.0 / band.plant
    top = min(largest_gain(inverse, c, r) for c, r in limits.circles)
    if not np.isfinite(top):
        raise Refused(
            "unbounded",
            "No gain brings this plant to the target, so no largest gain exists: give the controller's period "
            "or a model with dead time.",
        )
    # abs(Kp - j ki/w + j kd w + c/P) >= r/abs(P): centre and radius of every ellipse, (4, 2n).
    ellipses = np.hstack(
        [
            (band.w, c * inverse.real, c * inverse.imag + kd * band.w, (r * np.abs(inverse)) ** 2)
            for c, r in limits.circles
        ]
    )
    # The foot of the range closely: on a resonating plant nearly all action is integral.
    everywhere = top * np.concatenate([np.geomspace(1e-6, 0.5 / GAINS, 15), np.linspace(1.0 / GAINS, 1.0, GAINS)])
    if kd > 0.0:
        everywhere = np.concatenate([everywhere, top * np.geomspace(1.03, FURTHER, GAINS)])
    Kp = everywhere if near is None else near * NEARBY
    for look in range(LOOKS + 1):
        edges = lower_edges(ellipses, Kp)
        ki = np.min(edges, axis=1)
        if kd > 0.0 and look == 0:
            # With derivative action a gain beyond the first allowed run is one that lies past the ellipses.
            allowed = (ki > 0.0) & np.isfinite(ki)
            ki = np.where(allowed & (np.cumsum(np.diff(allowed, prepend=False) & ~allowed) == 0), ki, -np.inf)
        k = int(np.argmax(ki))
        if look == 0 and near is not None and (k in (0, len(Kp) - 1) or Kp[-1] > everywhere[-1]):
            return best_on_grid(band, limits, None, kd)
        found = float(Kp[k]), float(ki[k])
        around = slice(max(k - 1, 0), k + 2)
        ellipses = ellipses[:, np.min(edges[around], axis=0) < FAR * ki[k]]
        Kp = np.linspace(Kp[around][0], Kp[around][-1], ZOOM)
    return found


def lower_edges(ellipses: Floats, Kp: Floats) -> Floats:
    """(gains, ellipses) ki at which each ellipse begins; inf where it forbids no ki > 0."""
    w, real, imag, square = ellipses
    half = square - (Kp[:, None] + real) ** 2
    root = np.sqrt(np.maximum(half, 0.0))
    return np.where((half > 0) & (imag + root > 0), w * (imag - root), np.inf)
