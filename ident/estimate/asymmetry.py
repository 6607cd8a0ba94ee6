"""Asymmetry: do speeding up and slowing down have the same time constant? A drive without brakes has two."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ident.estimate.columns import columns
from ident.estimate.ground import Found
from ident.evidence.colour import coloured_covariance, inverse_gram
from ident.evidence.normal import solve_normal
from ident.findings import Finding

CLEAR = 4.0  # standard deviations of the difference
NOTABLE = 0.15  # of T: smaller differences change no setting
SHARE = 0.1  # of the slope's power that each direction must have to be judged


def up_and_down(found: Found) -> Iterator[Finding]:
    """A finding where the time constants of the two directions differ by more than chance and by enough to matter.

    The slope in log T is split by the direction in which the speed is moving, and one Gauss-Newton step from the
    common fit gives each direction its own.
    """
    at, layout = found.at, found.layout
    if at.log_count != 1:
        return
    # Not whitened, and without a start's own transient where there is one.
    plain = layout.colour.white and len(at.nuisance) == 1
    slope = at.jacobian[1] if plain else at.K * columns(layout, at.shape, at.L).slopes[0]
    # Past the corner the speed lags behind: a slope in log T below zero means that it is on its way up.
    up = slope < 0.0
    power = float(slope @ slope)
    rising = np.where(up, slope, 0.0)
    if power == 0.0 or not SHARE < float(rising @ rising) / power < 1.0 - SHARE:
        return
    rows = np.vstack((layout.whiten(np.stack((rising, slope - rising))), at.jacobian[:1], at.jacobian[2:]))
    gram = rows @ rows.T
    steps = solve_normal(gram, rows @ at.residual)
    if found.colour.white or not layout.colour.white:
        covariance = found.colour.variance * inverse_gram(gram)
    else:
        covariance = coloured_covariance(rows, found.colour)
    difference = float(steps[0] - steps[1])
    std = float(np.sqrt(max(covariance[0, 0] + covariance[1, 1] - 2.0 * covariance[0, 1], 1e-300)))
    if abs(difference) < max(CLEAR * std, NOTABLE):
        return
    T = at.shape.lags
    T_up, T_down = (T * float(np.exp(np.clip(step, -1.0, 1.0))) for step in steps[:2])
    slower = "slowing down" if T_down > T_up else "speeding up"
    yield Finding(
        "up-and-down-differ",
        "warning",
        f"Speeding up has a time constant near {T_up:.3g} s, slowing down near {T_down:.3g} s: one linear model is a "
        f"compromise between them. A drive that cannot brake does this, or a load that helps in one direction. Watch "
        f"the loop while {slower} before the settings are left in place.",
        {"T_up_s": T_up, "T_down_s": T_down, "difference_in_stds": abs(difference) / std},
    )
