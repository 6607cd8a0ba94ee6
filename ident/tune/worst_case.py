"""WorstCase: the margins over the plants that the log allows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ident.loop import PidSettings
from ident.plants import Plant

POINTS = 400
DECADES = (-2.5, 2.0)  # of the grid, about 1/(dead time in the loop)


@dataclass(frozen=True, slots=True)
class WorstCase:
    """Margins over the plants that the log allows.

    plants          how many were drawn
    Ms_median       median of Ms;  Ms_p95  its 95th percentile; None where more of them are unstable than that
    unstable_share  share of the plants on which the loop would be unstable
    """

    plants: int
    Ms_median: float | None
    Ms_p95: float | None
    unstable_share: float


def worst_case(
    plants: Sequence[Plant], settings: PidSettings, *, delay: float, period: float = 0.0, compute_delay: float = 0.0
) -> WorstCase | None:
    """Ms over drawn plants, on one grid for all; None without plants.

    delay  s, the dead time of the nominal plant: the grid lies about it
    Ms is right to about 0.1 % here; a single loop's `margins` are refined.
    """
    if not plants:
        return None
    lag = period / 2.0 + compute_delay
    centre = 1.0 / max(delay + lag, 1e-3 * settings.Ti)
    w = centre * np.logspace(*DECADES, POINTS)
    controller = settings.frequency_response(w) * np.exp(-1j * w * lag)
    loop = np.stack([plant.frequency_response(w) for plant in plants]) * controller
    back = 1.0 + loop
    # With one integrator and a stable plant, 1 + L turns from -90 degrees to 0; each encirclement takes 360 off.
    turned = np.sum(np.angle(back[:, 1:] / back[:, :-1]), axis=1)
    stable = turned > -np.pi / 2.0
    Ms = np.where(stable, 1.0 / np.abs(back).min(axis=1), np.inf)
    median, high = np.quantile(Ms, [0.5, 0.95], method="higher")
    return WorstCase(
        len(plants),
        float(median) if np.isfinite(median) else None,
        float(high) if np.isfinite(high) else None,
        float(np.mean(~stable)),
    )
