"""What a fit gives rise to notice: each finding with the figures behind it."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ident.estimate.asymmetry import up_and_down
from ident.estimate.first_order import LONGEST_T
from ident.estimate.ground import Found
from ident.estimate.layout import Layout
from ident.estimate.point import Point
from ident.evidence.estimates import Estimate
from ident.evidence.statistics import Statistics
from ident.findings import Finding

POOR_FIT = 50.0  # %
WIDE = 0.3  # half-width of an interval over the value
UNLIKELY = 0.01
POORLY_KNOWN = 0.25  # std of T over T: in a record short against T, only K/T is left
CLEAR_CORRELATION = 0.2


def findings(
    found: Found,
    parameters: dict[str, Estimate],
    derived: dict[str, Estimate],
    figures: Statistics,
) -> tuple[Finding, ...]:
    """All findings of one fit, in the order of the steps that raised them."""
    layout, at = found.layout, found.at
    return (
        *_start(layout),
        *found.noticed,
        *_integrating(layout, at, parameters, derived),
        *_set_aside(found),
        *_straight(layout),
        *_unseen(found),
        *_drift(layout, at),
        *up_and_down(found),
        *_widths(parameters),
        *_residuals(figures),
        *_dead_time(layout, at),
        *_validation(figures),
    )


def _start(layout: Layout) -> Iterator[Finding]:
    if any(s.start == "settled" for s in layout.stretches):
        yield Finding(
            "start-assumed-settled",
            "info",
            "The command moves within the first rows, so the fit assumes that the motor ran settled at the first "
            "command before the log began. Log a few seconds before the first move to make that visible.",
        )


def _integrating(
    layout: Layout, at: Point, parameters: dict[str, Estimate], derived: dict[str, Estimate]
) -> Iterator[Finding]:
    at_limit = at.shape.lags >= 0.99 * LONGEST_T * layout.duration
    if "T" not in parameters:
        return
    std = parameters["T"].std
    if at_limit or (at.shape.lags > 0.5 * layout.duration and (std is None or std > POORLY_KNOWN * at.shape.lags)):
        ratio = derived["K/T"]
        yield Finding(
            "integrating",
            "warning",
            "The speed goes on changing for as long as the command stands off: within this log the plant "
            f"integrates. K and T are poorly known, their ratio K/T = {ratio.value:.4g} {ratio.unit} is what counts.",
            {"duration_s": layout.duration, "T_s": at.shape.lags, "K_per_T": ratio.value, "K_per_T_std": ratio.std},
        )


def _set_aside(found: Found) -> Iterator[Finding]:
    if found.set_aside:
        yield Finding(
            "dynamics-left-out",
            "warning",
            "Under feedback a model of the noise keeps the parameters unbiased, but here what this model leaves is "
            "not noise: it lacks some of the plant's dynamics. The plain fit is reported; a richer model says more.",
        )


def _straight(layout: Layout) -> Iterator[Finding]:
    if layout.straight:
        yield Finding(
            "command-straight-between-samples",
            "info",
            "The command changes smoothly and was taken as straight between its samples, not held. If the controller "
            "does hold it over the log's own sample time, the dead time is half a sample shorter: say so.",
            {"sample_time_s": layout.step},
        )


def _unseen(found: Found) -> Iterator[Finding]:
    if found.unseen is not None:
        start, end = found.unseen
        yield Finding(
            "command-faster-than-the-log",
            "warning",
            f"From {start:.4g} to {end:.4g} s the command moves with fewer than seven samples a period: the log does "
            "not show what the motor was told there, and those rows were left out. Log faster, or sweep slower.",
            {"start_s": start, "end_s": end, "sample_time_s": found.layout.step},
        )


def _drift(layout: Layout, at: Point) -> Iterator[Finding]:
    if layout.drifting:
        slope = float(at.nuisance[1])
        over_log = slope * float(np.ptp(layout.clock))
        yield Finding(
            "slow-drift",
            "warning",
            f"The speed drifts by {over_log:.3g} of its units over this log along a straight line that the command "
            "does not explain (warming, a load that fills, a supply that sags). The line was fitted beside the model.",
            {"slope_per_s": slope, "over_log": over_log},
        )


def _widths(parameters: dict[str, Estimate]) -> Iterator[Finding]:
    for name in ("K", "T"):
        if name not in parameters:
            continue
        estimate = parameters[name]
        if estimate.std is None or 1.96 * estimate.std > WIDE * abs(estimate.value):
            yield Finding(
                "wide-interval",
                "warning",
                f"{name} is known only roughly from this log; settings that lean on it deserve a repeated or "
                "longer test.",
                {"parameter": name, "value": estimate.value, "std": estimate.std},
            )


def _residuals(figures: Statistics) -> Iterator[Finding]:
    if figures.fit_percent is not None and figures.fit_percent < POOR_FIT:
        yield Finding(
            "poor-fit",
            "warning",
            f"The model explains only {figures.fit_percent:.0f} % of the speed's movement (NRMSE): a disturbance, "
            "a load change or noise has the larger part in this log.",
            {"fit_percent": figures.fit_percent},
        )
    r = figures.max_autocorrelation
    if figures.whiteness_p is not None and r is not None and figures.whiteness_p < UNLIKELY:
        clear = abs(r) > CLEAR_CORRELATION
        yield Finding(
            "residuals-coloured",
            "info",
            "The residuals are not white"
            + (
                ": part of the motor's behaviour or a slow disturbance is left in them. "
                if clear
                else ", though weakly so. "
            )
            + "The intervals take their colour into account.",
            {
                "whiteness_p": figures.whiteness_p,
                "max_autocorrelation": r,
                "lag": figures.max_autocorrelation_lag,
            },
        )
    p = figures.input_correlation_p
    if p is not None and p < UNLIKELY:
        yield Finding(
            "residuals-follow-command",
            "info",
            "The residuals still depend on past commands: this model leaves some of the dynamics out.",
            {"input_correlation_p": p},
        )


def _dead_time(layout: Layout, at: Point) -> Iterator[Finding]:
    if at.L == 0.0:
        yield Finding(
            "no-dead-time-seen",
            "info",
            "The best dead time is zero: a delay shorter than the sample time cannot be excluded. Tuning adds half "
            "the controller's period all the same.",
            {"sample_time_s": layout.step},
        )


def _validation(figures: Statistics) -> Iterator[Finding]:
    if figures.validation_fit_percent is None:
        yield Finding(
            "no-validation",
            "info",
            "The log could not be split into two parts that both move, so the model is not tested on rows that it "
            "was not fitted to.",
        )
