"""Margin: what the controller in the machine makes of tonight's plant, beside the baseline's.

The two point values come from `ident.loop.margins`, the interval from `interval.py`.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

from ident.errors import Refused
from ident.findings import Finding
from ident.loop import PidSettings, margins
from ident.plants import Fopdt
from ident.record.segments import Floats
from ident.tune import tune
from ident.watch.interval import over_plants

SettingsFrom = Literal["installed", "log", "baseline"]


@dataclass(frozen=True, slots=True)
class MarginDrift:
    """Ms of one controller on the baseline's plant and on tonight's.

    Ms_baseline, Ms_now   None where unstable, or where there is no plant tonight
    ci95                  of Ms_now; an end is None where that end of the plausible plants is unstable
    unstable_share        of the plausible plants
    target                what the settings should hold
    settings_from         installed, log: as given, told or seen in a log; baseline: proposed for the baseline's plant,
                          as none were given
    """

    Ms_baseline: float | None
    Ms_now: float | None
    ci95: tuple[float | None, float | None]
    unstable_share: float | None
    target: float
    settings: PidSettings
    settings_from: SettingsFrom


@dataclass(frozen=True, slots=True)
class Controller:
    """What is in the machine, or would be, and how often it acts; times in s."""

    settings: PidSettings | None
    source: SettingsFrom
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
    z0: Floats, z: Floats | None, covariance: Floats | None, controller: Controller, seed: int
) -> tuple[MarginDrift | None, tuple[Finding, ...]]:
    """Margins at the baseline's coordinates z0 (3,) and tonight's z with covariance (3, 3); None without settings."""
    if controller.settings is None:
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
        controller = replace(controller, settings=proposed.settings, source="baseline")
    settings = controller.settings
    assert settings is not None
    before, now = controller.on(plant_at(z0)), None
    ends: tuple[float | None, float | None] = (None, None)
    share = None
    if z is not None and covariance is not None:
        found = over_plants(z, covariance, settings, controller.lag, seed)
        now, ends, share = controller.on(plant_at(z)), found.ci95, found.unstable_share
    return MarginDrift(before, now, ends, share, controller.target, settings, controller.source), ()


def plant_at(z: Floats) -> Fopdt:
    """The plant at coordinates (b, a, L), a > 0."""
    b, a, L = (float(v) for v in z)
    return Fopdt(b / a, 1.0 / a, max(L, 0.0))
