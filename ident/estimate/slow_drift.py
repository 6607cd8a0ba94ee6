"""Slow drift: a speed that wanders off along a straight line whatever the command does (warming, a filling belt).

Left in the residuals, such a line is taken up by the gain and the time constant of logs with few moves. Where the
data ask for it, it is fitted beside the offset.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ident.estimate.layout import Layout, levelled
from ident.estimate.point import Point, solve
from ident.estimate.refine import refine
from ident.evidence.colour import coloured_covariance, noise_colour

CLEAR = 5.0  # standard deviations of the line's slope, the residuals' colour accounted for
NOTABLE = 1.0  # of the residuals' rms: what the line must make over the whole log
GLANCE = 0.1  # of the same rms, by a line through the residuals alone: less is not looked into


def allow_drift(layout: Layout, at: Point) -> tuple[Layout, Point]:
    """The layout and its refitted point with a straight-line drift where the data ask for one, else both as they are.

    The test is the line's coefficient in one Gauss-Newton step beside all other parameters, over a standard deviation
    that takes the colour of what is then left into account: slow noise makes lines of its own.
    """
    clock = layout.clock
    # Most logs are seen at a glance to have none: what is left of the speed lies level.
    centred = clock - clock.mean()
    slope = float(centred @ at.raw) / float(centred @ centred)
    power = float(at.raw @ at.raw) / layout.rows
    if slope == 0.0 or abs(slope) * float(np.ptp(clock)) < GLANCE * np.sqrt(power):
        return layout, at
    rows = np.vstack((at.jacobian, clock))
    step = solve(rows, at.raw)
    left = at.raw - step @ rows
    spread = float(np.sqrt(max(coloured_covariance(rows, noise_colour(layout.parts(left)))[-1, -1], 0.0)))
    whole = abs(float(step[-1])) * float(np.ptp(clock))
    if abs(float(step[-1])) < CLEAR * spread or whole**2 < NOTABLE**2 * float(left @ left) / layout.rows:
        return layout, at
    drifting = replace(layout, drifting=True)
    return drifting, refine(drifting, at.shape, at.L)


def without_drift(layout: Layout, at: Point) -> Layout:
    """The layout with the fitted line taken off the speed, whitened as before."""
    if not layout.drifting:
        return layout
    slope = float(at.nuisance[1])
    level = levelled(
        tuple(replace(s, speed=s.speed - slope * (s.began + s.time)) for s in layout.stretches),
        layout.command_level,
        layout.speed_level,
    )
    return level.whitened(layout.colour)
