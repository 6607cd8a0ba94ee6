"""WorstCase: the margins over the plants that the log allows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.loop import PidSettings
from ident.plants import Plant

POINTS = 400
DECADES = (-2.5, 2.0)  # of the grid, about 1/(dead time in the loop)
QUANTILE = 0.95


@dataclass(frozen=True, slots=True)
class WorstCase:
    """Margins over the plants that the log allows.

    plants          how many were drawn
    Ms_median       median of Ms;  Ms_p95  its 95th percentile; None where more of them are unstable than that
    unstable_share  share of the plants on which the loop would be unstable
    Mt_p95          95th percentile of Mt, likewise
    """

    plants: int
    Ms_median: float | None
    Ms_p95: float | None
    unstable_share: float
    Mt_p95: float | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Cloud:
    """Drawn plants on one grid, hold and computing delay included: w (n,) rad/s, response (plants, n)."""

    w: NDArray[np.float64]
    response: NDArray[np.complex128]

    def peaks(self, settings: PidSettings) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """(plants,) Ms and Mt, inf where the loop is unstable; right to about 0.1 %."""
        loop = self.response * settings.frequency_response(self.w)
        back = 1.0 + loop
        # With one integrator and a stable plant, 1 + L turns from -90 degrees to 0; each encirclement takes 360 off.
        turned = _turned(back)
        stable = turned > -np.pi / 2.0
        S = 1.0 / np.abs(back)
        Mt = np.maximum((np.abs(loop) * S).max(axis=1), 1.0)
        return np.where(stable, S.max(axis=1), np.inf), np.where(stable, Mt, np.inf)

    def held_for(self, settings: PidSettings) -> float:
        """What max(Ms, Mt) stays below on 95 % of the plants; inf where more are unstable than that."""
        Ms, Mt = self.peaks(settings)
        return float(np.quantile(np.maximum(Ms, Mt), QUANTILE, method="higher"))

    def worst_case(self, settings: PidSettings) -> WorstCase:
        """The figures for a report."""
        Ms, Mt = self.peaks(settings)
        median, high = np.quantile(Ms, [0.5, QUANTILE], method="higher")
        top = np.quantile(Mt, QUANTILE, method="higher")
        return WorstCase(
            len(Ms),
            float(median) if np.isfinite(median) else None,
            float(high) if np.isfinite(high) else None,
            float(np.mean(np.isinf(Ms))),
            float(top) if np.isfinite(top) else None,
        )


def _turned(points: NDArray[np.complex128]) -> NDArray[np.float64]:
    """(m,) rad by which each path of points (m, n) turns about 0, less than half a turn at a time."""
    below = points.imag < 0.0
    before, after = points[:, :-1], points[:, 1:]
    # Only steps over the negative real axis change the branch of the angle.
    path, step = np.nonzero(below[:, 1:] != below[:, :-1])
    p, q = before[path, step], after[path, step]
    behind = (p.real * q.imag - q.real * p.imag > 0.0) == (p.imag >= 0.0)
    turns = np.bincount(path[behind], np.where(p.imag >= 0.0, 1.0, -1.0)[behind], len(points))
    return np.asarray(np.angle(points[:, -1]) - np.angle(points[:, 0]) + 2.0 * np.pi * turns)


def cloud(
    plants: Sequence[Plant], *, delay: float, lag: float, period: float = 0.0, compute_delay: float = 0.0
) -> Cloud | None:
    """The plants on one grid; None without plants.

    delay  s, the dead time of the nominal plant;  lag  s, a time to place the grid by where there is no dead time
    """
    if not plants:
        return None
    held = period / 2.0 + compute_delay
    w = 1.0 / max(delay + held, 1e-3 * lag) * np.logspace(*DECADES, POINTS)
    return Cloud(w, np.stack([plant.frequency_response(w) for plant in plants]) * np.exp(-1j * w * held))


def worst_case(
    plants: Sequence[Plant], settings: PidSettings, *, delay: float, period: float = 0.0, compute_delay: float = 0.0
) -> WorstCase | None:
    """Ms over drawn plants, on one grid for all; None without plants.

    delay  s, the dead time of the nominal plant: the grid lies about it
    Ms is right to about 0.1 % here; a single loop's `margins` are refined.
    """
    found = cloud(plants, delay=delay, lag=settings.Ti, period=period, compute_delay=compute_delay)
    return None if found is None else found.worst_case(settings)
