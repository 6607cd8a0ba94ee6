"""What an ARX fit gives rise to notice: each finding with the figures behind it."""

from __future__ import annotations

from collections.abc import Iterator

from ident.estimate.lagged import Runs
from ident.estimate.orders import MOST_A, MOST_B, Orders
from ident.evidence.statistics import Statistics
from ident.findings import Finding

POOR_FIT = 50.0  # %
UNLIKELY = 0.01


def findings(runs: Runs, found: Orders | None, figures: Statistics) -> tuple[Finding, ...]:
    """All findings of one fit; `found` is None where the caller gave the orders."""
    return (
        *_rows(runs),
        *_limits(found),
        *_residuals(figures),
        *_validation(figures),
    )


def _rows(runs: Runs) -> Iterator[Finding]:
    if runs.left_out:
        yield Finding(
            "rows-off-the-grid",
            "info",
            f"{runs.left_out} rows have another sample time than the rest and were left out: "
            "an ARX model has one sample time.",
            {"rows": runs.left_out, "sample_time_s": runs.step},
        )


def _limits(found: Orders | None) -> Iterator[Finding]:
    if found is not None and (found.na == MOST_A or found.nb == MOST_B or found.delay == len(found.over_delay)):
        yield Finding(
            "orders-at-limit",
            "info",
            "The best orders lie at the limit of the search: noise on the speed asks an ARX model for ever more "
            "terms, or the dead time is longer than the search went.",
            {"na": found.na, "nb": found.nb, "delay": found.delay, "most_delay": len(found.over_delay)},
        )


def _residuals(figures: Statistics) -> Iterator[Finding]:
    if figures.fit_percent is not None and figures.fit_percent < POOR_FIT:
        yield Finding(
            "poor-fit",
            "warning",
            f"The simulated model explains only {figures.fit_percent:.0f} % of the speed's movement (NRMSE): a "
            "disturbance, a load change or noise has the larger part in this log.",
            {"fit_percent": figures.fit_percent},
        )
    r = figures.max_autocorrelation
    if figures.whiteness_p is not None and r is not None and figures.whiteness_p < UNLIKELY:
        yield Finding(
            "residuals-coloured",
            "warning" if abs(r) > 0.1 else "info",
            "The one-step errors are not white, so the noise is not what an ARX model takes it for: its coefficients "
            "are off by more than their intervals say.",
            {"whiteness_p": figures.whiteness_p, "max_autocorrelation": r, "lag": figures.max_autocorrelation_lag},
        )
    p = figures.input_correlation_p
    if p is not None and p < UNLIKELY:
        yield Finding(
            "residuals-follow-command",
            "info",
            "The one-step errors still depend on past commands outside the equation: higher orders or another delay "
            "would say more.",
            {"input_correlation_p": p},
        )


def _validation(figures: Statistics) -> Iterator[Finding]:
    if figures.validation_fit_percent is None:
        yield Finding(
            "no-validation",
            "info",
            "The log could not be split into two parts that both move, so the model is not tested on rows that it "
            "was not fitted to.",
        )
