"""Statistics: how well a fit describes the log."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Statistics:
    """How well a fit describes the log; fit_percent is of the simulated response."""

    fit_percent: float | None
    rms_residual: float
    aicc: float | None
    bic: float | None
    whiteness_p: float | None
    max_autocorrelation: float | None
    max_autocorrelation_lag: int | None
    input_correlation_p: float | None
    validation_fit_percent: float | None
    rows_used: int
