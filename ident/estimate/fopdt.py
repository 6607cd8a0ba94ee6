"""The FOPDT fit: separable least squares of the simulated response, with everything said about it."""

from __future__ import annotations

import numpy as np

from ident.estimate.diagnostics import statistics
from ident.estimate.driven import driven
from ident.estimate.fit import Fit, Spread
from ident.estimate.friction import friction_levels
from ident.estimate.ground import Ground, friction_on_record, on_record, with_noise
from ident.estimate.known import require_known
from ident.estimate.noticed import findings
from ident.estimate.uncertainty import (
    covariance_of,
    dead_time_estimate,
    dead_time_profile,
    log_estimate,
    uncertainty,
)
from ident.estimate.units import gain_rate_unit, gain_unit
from ident.estimate.validation import validation_fit
from ident.plants import Fopdt


def fit_fopdt(base: Ground) -> Fit:
    """Least-squares FOPDT.

    Gain, offset and initial transients are linear and eliminated; (T, L) are found globally on a thinned record,
    the dead time cell by cell, and refined with analytic slopes on the full one.

    Raises NotIdentifiable where neither the gain nor K/T comes out.
    """
    found = with_noise(base, base.first)
    layout, at = found.layout, found.at
    known = uncertainty(layout, at, found.colour)
    require_known(found, known)
    T = at.shape.lags
    K_std, T_std, L_std = np.sqrt(np.maximum(np.diag(known.log_covariance), 0.0))
    profile = dead_time_profile(layout, at, known, base.window if at is base.first else None)
    parameters = {
        "K": log_estimate(at.K, float(K_std), gain_unit(base.record)),
        "T": log_estimate(T, float(T_std), "s"),
        "L": dead_time_estimate(at.L, float(L_std), profile),
    }
    derived = {"K/T": log_estimate(at.K / T, known.std_log_ratio(), gain_rate_unit(base.record))}
    figures = statistics(layout, at, found.colour, validation_fit(layout, at))
    return Fit(
        name="fopdt",
        model=Fopdt(at.K, T, at.L),
        parameters=parameters,
        derived=derived,
        covariance=covariance_of(("K", "T", "L"), np.diag([at.K, T, 1.0]), known),
        friction=friction_levels(layout, at, found.colour, base.record.command_unit),
        statistics=figures,
        findings=findings(found, parameters, derived, figures),
        simulated=on_record(base, at),
        profile=profile,
        spread=Spread(at.shape, known.log_covariance),
        driven=driven(base, found),
        noise=found.colour,
        friction_speed=friction_on_record(base, found),
    )
