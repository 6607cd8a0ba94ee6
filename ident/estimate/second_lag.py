"""Second lag: is there anything in the residuals of a first-order fit that a second time constant could explain?

A small second lag acts as dead time, but rounds the corner at which the answer starts: its mark is the second
difference of the answer over about as many samples as it lasts. A score test on a few of these (Rao 1948) is within
chance of what the whole second-order fit would gain, at a small part of its cost.
"""

from __future__ import annotations

import numpy as np

from ident.estimate.ground import Ground
from ident.evidence.normal import solve_normal
from ident.evidence.statistics import Statistics
from ident.record.segments import Floats

PLAUSIBLE = 0.05  # p of both residual tests above which the residuals show nothing by themselves
# A second order is only taken where AICc falls by ten, a gain of about twelve in the log-likelihood ratio.
TOO_LITTLE = 5.0
SHARES = (0.05, 0.15, 0.4)  # of T: how long the second lag may last


def nothing_left(base: Ground, figures: Statistics) -> bool:
    """Whether a second time constant has nothing to explain, in residuals that are white as they stand."""
    white, independent = figures.whiteness_p, figures.input_correlation_p
    if figures.noise_order or white is None or independent is None or min(white, independent) < PLAUSIBLE:
        return False
    at, layout = base.first, base.layout
    lags = sorted({1, *(max(round(share * at.shape.lags / layout.step), 1) for share in SHARES)})
    marks = np.stack([_second_difference(layout.parts(at.jacobian[0]), lag) for lag in lags])
    onto = marks @ at.jacobian.T
    projected = np.stack([solve_normal(at.gram, row) for row in onto])
    gram = marks @ marks.T - projected @ onto.T
    toward = marks @ at.residual - projected @ at.toward
    gained = float(toward @ solve_normal(gram, toward)) / at.rss * layout.rows
    return gained < TOO_LITTLE


def _second_difference(parts: list[Floats], lag: int) -> Floats:
    """Over `lag` rows on either side, each stretch by itself; 0 where one is missing."""
    out = []
    for part in parts:
        own = np.zeros(len(part))
        if len(part) > 2 * lag:
            own[lag:-lag] = part[2 * lag :] - 2.0 * part[lag:-lag] + part[: -2 * lag]
        out.append(own)
    return np.concatenate(out)
