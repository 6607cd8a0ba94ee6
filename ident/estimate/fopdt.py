"""The FOPDT fit: separable least squares of the simulated response, with everything said about it."""

from __future__ import annotations

import math

import numpy as np

from ident.errors import NotIdentifiable
from ident.estimate.coloured import coloured
from ident.estimate.diagnostics import statistics
from ident.estimate.fit import Fit
from ident.estimate.layout import Layout, lay_out
from ident.estimate.noticed import findings
from ident.estimate.point import Point
from ident.estimate.search import search, settle
from ident.estimate.uncertainty import (
    Uncertainty,
    dead_time_estimate,
    dead_time_profile,
    log_estimate,
    parameter_covariance,
    uncertainty,
)
from ident.estimate.validation import validation_fit
from ident.evidence.colour import WHITE, Colour, coloured_covariance, noise_colour
from ident.evidence.estimates import Estimate
from ident.evidence.feedback import feedback
from ident.plants import Fopdt
from ident.record import LoopRecord
from ident.record.segments import Floats

# Std of log|K| or of log|K/T| above which the log has not said what the plant does.
KNOWN = 0.5
# The response, its shape given, in its own standard deviations. Searched over all shapes, pure noise reaches four or
# five; so a response of six is one.
CLEAR = 6.0


def fit_fopdt(record: LoopRecord) -> Fit:
    """Least-squares FOPDT of a record.

    Gain, offset and initial transients are linear and eliminated; (T, L) are found globally on a thinned record,
    the dead time cell by cell, and refined with analytic slopes on the full one.

    Raises NotIdentifiable: too-short, or not-identifiable where the command or the speed does not move, or
    neither the gain nor K/T comes out.
    """
    layout = lay_out(record)
    _require_movement(record, layout)
    at = search(layout)
    if any(s.start == "joined" for s in layout.stretches):
        layout, at = _leave_out_unknown_past(layout, at)
    colour = noise_colour(layout.parts(at.raw))
    if not colour.white and feedback([s.command for s in layout.stretches], [s.speed for s in layout.stretches]):
        layout, at = coloured(layout, at)
        colour = layout.colour
    known = uncertainty(layout, at, colour)
    _require_known(layout, at, colour, known)
    profile = dead_time_profile(layout, at, known)
    figures = statistics(layout, at, colour, validation_fit(layout, at))
    parameters, derived = _estimates(record, at, known)
    parameters["L"] = dead_time_estimate(at.L, math.sqrt(known.log_covariance[2, 2]), profile)
    return Fit(
        name="fopdt",
        model=Fopdt(at.K, at.shape.lags, at.L),
        parameters=parameters,
        derived=derived,
        covariance=parameter_covariance(at, known),
        friction=None,
        statistics=figures,
        findings=findings(layout, at, parameters, derived, figures),
        simulated=_on_record(record, layout, at),
        profile=profile,
    )


def _require_movement(record: LoopRecord, layout: Layout) -> None:
    for name, unit, series in (
        ("command", record.command_unit, [s.command for s in layout.stretches]),
        ("speed", record.speed_unit, [s.speed for s in layout.stretches]),
    ):
        values = np.concatenate(series)
        if float(np.ptp(values)) <= 1e-12 * float(np.abs(values).max()):
            raise NotIdentifiable(
                "not-identifiable",
                f"The {name} never moves, so the log cannot say what the motor does with a command: "
                "log a test in which the command takes at least one clear step and the speed follows.",
                {"constant": name, "unit": unit, "rows": len(values)},
            )


def _leave_out_unknown_past(layout: Layout, at: Point) -> tuple[Layout, Point]:
    """Without the rows that answer to a command before the log; again where L turns out longer."""
    margin = 2.0 * layout.step
    for _ in range(4):
        shorter = layout.skipping(at.L + margin)
        at = settle(shorter, at.shape.lags, at.L)
        if at.L <= shorter.stretches[-1].time[shorter.stretches[-1].skip] or shorter.stretches[-1].start != "joined":
            break
    return shorter, at


def _require_known(layout: Layout, at: Point, colour: Colour, known: Uncertainty) -> None:
    gain, ratio = math.sqrt(max(known.log_covariance[0, 0], 0.0)), known.std_log_ratio()
    # Whitened slopes leave white noise of the colour's variance.
    left = colour if layout.colour.white else Colour(WHITE.predictors, colour.variances[-1:])
    shape_given = coloured_covariance(np.delete(at.jacobian, (1, 2), axis=0), left)
    clear = abs(at.K) / math.sqrt(max(float(shape_given[0, 0]), 1e-300))
    if at.K == 0.0 or clear < CLEAR or not (gain <= KNOWN or ratio <= KNOWN):
        raise NotIdentifiable(
            "not-identifiable",
            "The speed does not answer to the command by clearly more than its noise, so neither the gain nor K/T can "
            "be told. Log a larger or longer step of the command.",
            {"response_in_stds": clear, "relative_std_gain": min(gain, 1e9), "relative_std_ratio": min(ratio, 1e9)},
        )


def _estimates(record: LoopRecord, at: Point, known: Uncertainty) -> tuple[dict[str, Estimate], dict[str, Estimate]]:
    c = known.log_covariance
    y, u = _bare(record.speed_unit or "speed"), _bare(record.command_unit or "command")
    parameters = {
        "K": log_estimate(at.K, math.sqrt(max(c[0, 0], 0.0)), f"{y}/{u}"),
        "T": log_estimate(at.shape.lags, math.sqrt(max(c[1, 1], 0.0)), "s"),
    }
    return parameters, {"K/T": log_estimate(at.K / at.shape.lags, known.std_log_ratio(), f"{y}/({u}·s)")}


def _bare(unit: str) -> str:
    """A unit that may stand beside a solidus: compound ones go into brackets."""
    return f"({unit})" if any(sign in unit for sign in "/ ·*") else unit


def _on_record(record: LoopRecord, layout: Layout, at: Point) -> Floats:
    simulated = np.full(record.rows, np.nan)
    row = 0
    for s in layout.stretches:
        n = s.rows - s.skip
        part = slice(s.row0 + s.skip, s.row0 + s.rows)
        simulated[part] = s.speed[s.skip :] - at.raw[row : row + n] + layout.speed_level
        row += n
    simulated.flags.writeable = False
    return simulated
