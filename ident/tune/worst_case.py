"""WorstCase: the margins over the plants that the log allows."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class WorstCase:
    """Margins over the plants that the log allows."""

    plants: int
    Ms_median: float | None
    Ms_p95: float | None
    unstable_share: float
