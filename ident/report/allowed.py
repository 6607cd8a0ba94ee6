"""Allowed: the plants that a log allows, drawn with its fit at hand or again from a report."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from ident.estimate import Fit, plausible, plausible_again
from ident.evidence import Covariance
from ident.plants.steps import Lagged
from ident.tune import Cloud, cloud

PLANTS = 200


def allowed(fitted: Fit, *, seed: int, period: float, compute_delay: float) -> Cloud | None:
    """The plants about a fit; None for a model that none are drawn from."""
    drawn = plausible(fitted, np.random.default_rng(seed), PLANTS)
    return cloud(
        drawn, delay=fitted.model.dead_time, lag=_lag(fitted.model, period), period=period, compute_delay=compute_delay
    )


def allowed_again(
    plant: Any,
    spread: Mapping[str, Sequence[Any]] | None,
    *,
    seed: int,
    period: float = 0.0,
    compute_delay: float = 0.0,
) -> Cloud | None:
    """The same about a report's model, with the `spread` {names, matrix} of its fit; None without one."""
    if spread is None or not isinstance(plant, Lagged):
        return None
    known = Covariance(tuple(spread["names"]), tuple(tuple(row) for row in spread["matrix"]))
    drawn = plausible_again(plant, known, np.random.default_rng(seed), PLANTS)
    return cloud(drawn, delay=plant.L, lag=_lag(plant, period), period=period, compute_delay=compute_delay)


def _lag(plant: Any, period: float) -> float:
    return float(getattr(plant, "T", 0.0) or getattr(plant, "T1", 0.0) or period)
