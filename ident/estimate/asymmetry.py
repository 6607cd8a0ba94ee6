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

    Beside the slope in log T goes its part in which the speed is rising, and one Gauss-Newton step from the common fit
    says how much of it the rise alone asks for.
    """
    at, layout = found.at, found.layout
    if at.log_count != 1:
        return
    white = layout.colour.white
    slope = at.jacobian[1] if white else at.K * columns(layout, at.shape, at.L).slopes[0]
    # Past the corner the speed lags behind: a slope in log T below zero means that it is on its way up.
    rising = np.minimum(slope, 0.0)
    power = float(slope @ slope)
    if power == 0.0 or not SHARE < float(rising @ rising) / power < 1.0 - SHARE:
        return
    rising = layout.whiten(rising)
    across, own = at.jacobian @ rising, float(rising @ rising)
    gram = np.block([[at.gram, across[:, None]], [across[None], np.array([[own]])]])
    steps = solve_normal(gram, np.append(at.toward, rising @ at.residual))
    if white and not found.colour.white:
        variance = float(coloured_covariance(np.vstack((at.jacobian, rising)), found.colour)[-1, -1])
    else:
        variance = found.colour.variance * float(inverse_gram(gram)[-1, -1])
    both, difference = float(steps[1]), float(steps[-1])
    std = float(np.sqrt(max(variance, 1e-300)))
    if abs(difference) < max(CLEAR * std, NOTABLE):
        return
    T = at.shape.lags
    T_up, T_down = (T * float(np.exp(np.clip(step, -1.0, 1.0))) for step in (both + difference, both))
    slower = "slowing down" if T_down > T_up else "speeding up"
    yield Finding(
        "up-and-down-differ",
        "warning",
        f"Speeding up has a time constant near {T_up:.3g} s, slowing down near {T_down:.3g} s: one linear model is a "
        f"compromise between them. A drive that cannot brake does this, or a load that helps in one direction. Watch "
        f"the loop while {slower} before the settings are left in place.",
        {"T_up_s": T_up, "T_down_s": T_down, "difference_in_stds": abs(difference) / std},
    )
