"""Known: has the log said what the plant does?"""

from __future__ import annotations

import math

import numpy as np

from ident.errors import NotIdentifiable
from ident.estimate.ground import Found
from ident.estimate.uncertainty import Uncertainty
from ident.evidence.colour import coloured_covariance, inverse_gram

# Std of log|K| or of log|K/T| above which the log has not said what the plant does.
KNOWN = 0.5
# The response, its shape given, in its own standard deviations. Searched over all shapes, pure noise reaches four or
# five; so a response of six is one.
CLEAR = 6.0


def require_known(found: Found, known: Uncertainty) -> None:
    """Raise NotIdentifiable where the speed does not clearly answer, or neither the gain nor K/T comes out."""
    at, colour = found.at, found.colour
    gain, ratio = math.sqrt(max(known.log_covariance[0, 0], 0.0)), known.std_log_ratio()
    linear = np.delete(np.arange(len(at.gram)), range(1, 2 + at.log_count))
    # Whitened slopes leave white noise of the colour's variance.
    if colour.white or not found.layout.colour.white:
        shape_given = colour.variance * inverse_gram(at.gram[np.ix_(linear, linear)])
    else:
        shape_given = coloured_covariance(at.jacobian[linear], colour)
    clear = abs(at.K) / math.sqrt(max(float(shape_given[0, 0]), 1e-300))
    if at.K == 0.0 or clear < CLEAR or not (gain <= KNOWN or ratio <= KNOWN):
        raise NotIdentifiable(
            "not-identifiable",
            "The speed does not answer to the command by clearly more than its noise, so neither the gain nor K/T can "
            "be told. Log a larger or longer step of the command.",
            {"response_in_stds": clear, "relative_std_gain": min(gain, 1e9), "relative_std_ratio": min(ratio, 1e9)},
        )
