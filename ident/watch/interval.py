"""Interval: Ms of one controller over the plants that a night allows.

Plants are drawn as b exp(-L s)/(s + a) from the night's covariance, a and L cut at 0. All of them are swept at once
on one grid, which gives Ms to about 1e-3. A plant that the controller does not stabilise has no Ms: it counts as
infinite, so an end of the interval that lies among such plants is None, and their share is told.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.loop import PidSettings
from ident.record.segments import Floats
from ident.watch.coordinates import covariance, place
from ident.watch.night import Estimated, Night

PLANTS = 400
LOW, HIGH = 1e-2, 1e2  # abs of the loop below and above which S is 1 or 0
WIDE, CLOSE = 15, 150  # frequencies per decade: to find where loops are decided, and there
TURNS = 100.0  # rad of delay phase; a loop still above 1 there is unstable or will never be installed


@dataclass(frozen=True, slots=True)
class MarginInterval:
    """Ms over the plants that one log allows.

    Ms_median, ci95   None where the loop is unstable there;  unstable_share  of those plants
    """

    Ms_median: float | None
    ci95: tuple[float | None, float | None]
    unstable_share: float


def margin_interval(
    night: Night | Estimated, settings: PidSettings, *, period: float = 0.0, compute_delay: float = 0.0, seed: int = 0
) -> MarginInterval:
    """Ms of a controller on 400 plants drawn from a first-order fit's covariance.

    period   of the controller, s, 0 for analogue: half of it is dead time;  compute_delay  s
    seed     of the draws: the same night and settings give the same interval
    Raises Refused night-unusable.
    """
    one = night if isinstance(night, Night) else Night.of(night)
    return over_plants(place(one), covariance(one), settings, period / 2.0 + compute_delay, seed)


def over_plants(z: Floats, own: Floats, settings: PidSettings, lag: float, seed: int) -> MarginInterval:
    """The same at coordinates z (3,) with covariance (3, 3); lag in s, added to each dead time."""
    Ms = sensitivities(plausible(z, own, PLANTS, seed), settings, lag)
    low, median, high = (
        float(v) if np.isfinite(v) else None for v in np.quantile(Ms, (0.025, 0.5, 0.975), method="closest_observation")
    )
    return MarginInterval(median, (low, high), float(np.mean(np.isinf(Ms))))


def plausible(z: Floats, own: Floats, plants: int, seed: int) -> Floats:
    """(plants, 3) coordinates drawn around z with covariance `own`, a and L at least 0."""
    size = np.sqrt(np.maximum(np.diagonal(own), 1e-300))
    values, vectors = np.linalg.eigh(own / np.outer(size, size))
    root = size[:, None] * vectors * np.sqrt(np.maximum(values, 0.0))
    drawn = z + np.random.default_rng(seed).standard_normal((plants, 3)) @ root.T
    drawn[:, 1:] = np.maximum(drawn[:, 1:], 0.0)
    return np.asarray(drawn)


def sensitivities(z: Floats, settings: PidSettings, lag: float) -> Floats:
    """Ms of each plant (n, 3) with the settings, (n,); inf where the loop is unstable.

    lag  s, added to each dead time. Stability by the turns of 1 + L, as in `ident.loop.nyquist`.
    """
    w = _band(z, settings, lag)
    loop = _loop(z, w, settings, lag)
    distance = 1.0 + loop
    turned = np.sum(np.angle(distance[:, 1:] / distance[:, :-1]), axis=1)
    start = np.angle(distance[:, 0] * 1j) - np.pi / 2.0
    right_sign = z[:, 0] * settings.Kp > 0.0
    stable = right_sign & (np.abs(start + turned) < 0.75 * np.pi) & (np.abs(loop[:, -1]) < 1.0)
    return np.where(stable, np.maximum(_peak(1.0 / np.abs(distance)), 1.0), np.inf)


def _band(z: Floats, settings: PidSettings, lag: float) -> Floats:
    """Frequencies where any of the loops is neither huge nor tiny."""
    scale = 1.0 / (float(z[:, 2].mean()) + lag + float(1.0 / (z[:, 1].mean() + 1.0 / settings.Ti)))
    wide = scale * np.geomspace(1e-5, 1e6, 11 * WIDE)
    b, a, _ = (column[:, None] for column in z.T)
    size = np.abs(b * settings.frequency_response(wide)) / np.hypot(wide, a)
    decided = wide[((size > LOW) & (size < HIGH)).any(axis=0)]
    usual = float(np.median(z[:, 2])) + lag
    top = min(float(decided[-1]), TURNS / usual) if usual > 0.0 else float(decided[-1])
    low = min(float(decided[0]), top / 10.0)
    return np.geomspace(low, top, int(np.ceil(CLOSE * np.log10(top / low))))


def _loop(z: Floats, w: Floats, settings: PidSettings, lag: float) -> np.ndarray:
    b, a, L = (column[:, None] for column in z.T)
    return np.asarray(b * np.exp(-1j * (L + lag) * w) / (1j * w + a) * settings.frequency_response(w))


def _peak(heights: Floats) -> Floats:
    """Maximum of each row, a parabola laid through it and its neighbours."""
    top = np.clip(np.argmax(heights, axis=1), 1, heights.shape[1] - 2)
    rows = np.arange(len(heights))
    before, at, after = (heights[rows, top + k] for k in (-1, 0, 1))
    bend = before - 2.0 * at + after
    with np.errstate(all="ignore"):
        rise = np.where(bend < 0.0, (after - before) ** 2 / (-8.0 * bend), 0.0)
    return np.asarray(np.where((at >= before) & (at >= after), at + rise, heights.max(axis=1)))
