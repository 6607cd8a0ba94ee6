"""Statistics: how well a fit describes the log."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Statistics:
    """Figures of one fit; None where there are too few rows, or nothing left to test.

    fit_percent             NRMSE fit of the simulated response
    rms_residual            of measured less simulated speed, speed unit
    aicc, bic               of the prediction errors, noise terms counted
    whiteness_p             Ljung-Box p of the prediction errors; with their largest autocorrelation and its lag
    input_correlation_p     p that past commands explain nothing of the prediction errors beyond the model
    validation_fit_percent  fit on rows held out, where those move
    noise_order             terms of the noise model; 0: the noise is white, prediction and simulation errors agree
    """

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
    noise_order: int = 0
