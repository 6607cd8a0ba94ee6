"""Margin: what the controller in the machine makes of tonight's plant, with an interval from plausible plants.

Plants are drawn as b exp(-L s)/(s + a) from the night's covariance, a and L cut at 0. All of them are swept at once
on one grid, which gives Ms to about 1e-3; the two point values come from `ident.loop.margins`. A plant that the
controller does not stabilise has no Ms: it counts as infinite, so an end of the interval that lies among such
plants is None, and their share is told.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from ident.errors import Refused
from ident.findings import Finding
from ident.loop import PidSettings, margins
from ident.plants import Fopdt
from ident.record.segments import Floats
from ident.tune import tune

LOW, HIGH = 1e-2, 1e2  # abs of the loop below and above which S is 1 or 0
POINTS = 1200
TURNS = 100.0  # rad of delay phase; a loop still above 1 there is unstable or will never be installed


@dataclass(frozen=True, slots=True)
class MarginDrift:
    """Ms of one controller on the baseline's plant and on tonight's.

    Ms_baseline, Ms_now   None where unstable, or where there is no plant tonight
    ci95                  of Ms_now; an end is None where that end of the plausible plants is unstable
    unstable_share        of the plausible plants
    target                what the settings should hold
    settings_from         installed: as given; baseline: proposed for the baseline's plant, as none were given
    """

    Ms_baseline: float | None
    Ms_now: float | None
    ci95: tuple[float | None, float | None]
    unstable_share: float | None
    target: float
    settings: PidSettings
    settings_from: Literal["installed", "baseline"]


@dataclass(frozen=True, slots=True)
class Controller:
    """What is in the machine, or would be, and how often it acts; times in s."""

    settings: PidSettings | None
    period: float
    compute_delay: float
    target: float

    @property
    def lag(self) -> float:
        """s: what holding and computing add to the dead time."""
        return self.period / 2.0 + self.compute_delay

    def on(self, plant: Fopdt) -> float | None:
        """Ms on a plant; None where unstable."""
        assert self.settings is not None
        return margins(plant, self.settings, period=self.period, compute_delay=self.compute_delay).Ms


def margin_drift(
    z0: Floats, z: Floats | None, covariance: Floats | None, controller: Controller, plants: int, seed: int
) -> tuple[MarginDrift | None, tuple[Finding, ...]]:
    """Margins at the baseline's coordinates z0 (3,) and tonight's z with covariance (3, 3); None without settings."""
    chosen: Literal["installed", "baseline"] = "installed"
    if controller.settings is None:
        chosen = "baseline"
        try:
            proposed = tune(
                plant_at(z0),
                Ms=controller.target,
                period=controller.period,
                compute_delay=controller.compute_delay,
            )
        except Refused as error:
            return None, (
                Finding(
                    "margin-unknown",
                    "warning",
                    "No settings are known to be installed and none can be proposed for the baseline's plant, so there "
                    f"is no margin to watch: {error.message}",
                ),
            )
        controller = Controller(proposed.settings, controller.period, controller.compute_delay, controller.target)
    settings = controller.settings
    assert settings is not None
    before = controller.on(plant_at(z0))
    if z is None or covariance is None:
        return MarginDrift(before, None, (None, None), None, controller.target, settings, chosen), ()
    Ms = sensitivities(plausible(z, covariance, plants, seed), settings, controller.lag)
    low, high = (float(v) for v in np.quantile(Ms, (0.025, 0.975), method="closest_observation"))
    ends = (low if np.isfinite(low) else None, high if np.isfinite(high) else None)
    share = float(np.mean(np.isinf(Ms)))
    return MarginDrift(before, controller.on(plant_at(z)), ends, share, controller.target, settings, chosen), ()


def plant_at(z: Floats) -> Fopdt:
    """The plant at coordinates (b, a, L), a > 0."""
    b, a, L = (float(v) for v in z)
    return Fopdt(b / a, 1.0 / a, max(L, 0.0))


def plausible(z: Floats, covariance: Floats, plants: int, seed: int) -> Floats:
    """(plants, 3) coordinates drawn around z, with a and L at least 0."""
    size = np.sqrt(np.maximum(np.diagonal(covariance), 1e-300))
    values, vectors = np.linalg.eigh(covariance / np.outer(size, size))
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
    wide = scale * np.geomspace(1e-5, 1e6, 600)
    size = np.abs(_loop(z, wide, settings, lag))
    decided = wide[((size > LOW) & (size < HIGH)).any(axis=0)]
    usual = float(np.median(z[:, 2])) + lag
    top = min(float(decided[-1]), TURNS / usual) if usual > 0.0 else float(decided[-1])
    return np.geomspace(min(float(decided[0]), top / 10.0), top, POINTS)


def _loop(z: Floats, w: Floats, settings: PidSettings, lag: float) -> np.ndarray:
    b, a, L = (column[:, None] for column in z.T)
    controller = settings.frequency_response(w)
    return np.asarray(b * np.exp(-1j * (L + lag) * w) / (1j * w + a) * controller)


def _peak(heights: Floats) -> Floats:
    """Maximum of each row, a parabola laid through it and its neighbours."""
    top = np.clip(np.argmax(heights, axis=1), 1, heights.shape[1] - 2)
    rows = np.arange(len(heights))
    before, at, after = (heights[rows, top + k] for k in (-1, 0, 1))
    bend = before - 2.0 * at + after
    with np.errstate(all="ignore"):
        rise = np.where(bend < 0.0, (after - before) ** 2 / (-8.0 * bend), 0.0)
    return np.asarray(np.where((at >= before) & (at >= after), at + rise, heights.max(axis=1)))
