"""Hold: settings that keep the target on 95 % of the plants that the log allows, not on the fitted one alone."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ident.errors import Refused
from ident.loop import PidSettings
from ident.tune.worst_case import Cloud

CALMEST = 1.02  # Ms on the fitted plant
TURNS, CLOSE = 12, 2e-3
WIDE = 1.1  # times the target: where 95 % of the plants stay below this only, holding the target is worth its price


def wide(allowed: Cloud, settings: PidSettings, M: float) -> bool:
    """Whether the log leaves the plant so open that settings for the fitted one do not hold elsewhere.

    The rule: max(Ms, Mt), which 95 % of the allowed plants stay below, is more than 1.1 times the target.
    """
    return allowed.held_for(settings) > WIDE * M


def hold(allowed: Cloud, M: float, best: Callable[[float], PidSettings]) -> PidSettings:
    """The best settings with max(Ms, Mt) <= M on 95 % of the plants.

    best  settings for a limit on the fitted plant: this is turned down until the plants agree (bisection with a secant
          step in log(M - 1))
    Raises Refused target-unreachable where even the calmest loop does not.
    """
    low, high = np.log(CALMEST - 1.0), np.log(M - 1.0)
    settings = best(M)
    over = _over(allowed, settings, M)
    if over <= 0.0:
        return settings
    calm = best(1.0 + float(np.exp(low)))
    under = _over(allowed, calm, M)
    if under > 0.0:
        raise Refused(
            "target-unreachable",
            f"The log leaves the plant too open to hold Ms {M:g} on 95 % of the plants that it allows: the calmest "
            f"loop tried stays below {allowed.held_for(calm):.3g}. Record a longer or livelier log.",
        )
    settings = calm
    for _ in range(TURNS):
        share = 0.5 if not np.isfinite(over) else float(np.clip(-under / (over - under), 0.1, 0.9))
        middle = low + share * (high - low)
        tried = best(1.0 + float(np.exp(middle)))
        at = _over(allowed, tried, M)
        if at <= 0.0:
            low, under, settings = middle, at, tried
            if at > -CLOSE:
                break
        else:
            high, over = middle, at
    return settings


def _over(allowed: Cloud, settings: PidSettings, M: float) -> float:
    reached = allowed.held_for(settings)
    return float(np.log(max(reached - 1.0, 1e-6) / (M - 1.0)))
