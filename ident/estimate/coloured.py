"""Coloured: the fit iterated with a model of the noise, so that logs taken under feedback give unbiased parameters.

Under feedback the command answers to past noise, and least squares of the simulated response is biased by whatever
colour that noise has. Whitened residuals (a prediction-error fit with a free noise model) take the bias out; where the
noise is white this is the plain fit. (Ljung, System Identification, 1999, chapters 7 and 13; Young 2011, Recursive
Estimation and Time-Series Analysis; Forssell and Ljung 1999, Automatica 35, 1215-1241: the direct method.)
"""

from __future__ import annotations

import numpy as np

from ident.estimate.layout import Layout
from ident.estimate.point import Point, point, solve
from ident.evidence.colour import inverse_gram, noise_colour
from ident.record.segments import Floats

MOST_ROUNDS = 25
SETTLED = 0.02  # of a standard deviation: what the last joint step may still move a parameter


def coloured(layout: Layout, at: Point) -> tuple[Layout, Point]:
    """The whitened layout and the point where noise model and plant agree, from a plain fit of the same rows.

    Each round takes the noise's colour from the residuals and makes one Gauss-Newton step in which plant and noise
    parameters move together; the colour itself is then taken afresh.
    """
    for _ in range(MOST_ROUNDS):
        colour = noise_colour(layout.parts(at.raw))
        white = layout.whitened(colour)
        at = point(white, at.shape, at.L)
        if colour.white:
            return white, at
        k = at.log_count
        joint = np.vstack((at.jacobian, noise_slopes(white, at)))
        step = solve(joint, at.residual)[1 : 2 + k]
        spread = np.sqrt(np.maximum(np.diag(inverse_gram(joint @ joint.T))[1 : 2 + k], 0.0) * at.rss / layout.rows)
        moved = point(white, at.shape.moved(step[:k], layout), max(at.L + float(step[k]), 0.0))
        at = moved if moved.rss <= 1.05 * at.rss else point(white, at.shape.moved(0.3 * step[:k], layout), at.L)
        if np.all(np.abs(step) <= SETTLED * spread):
            break
    return white, at


def noise_slopes(layout: Layout, at: Point) -> Floats:
    """Slopes (order, rows) of the whitened residual's negative in the noise model's terms: minus the past residuals."""
    order = layout.colour.order
    slopes = np.zeros((order, layout.rows))
    row = 0
    for part in layout.parts(at.raw):
        n = len(part)
        for lag in range(1, order + 1):
            # The first rows have shorter predictors of their own; they say little of the long one's terms.
            slopes[lag - 1, row + order : row + n] = -part[order - lag : n - lag]
        row += n
    return slopes
