"""Validation: the model fitted on the first part of a record, simulated over the rest."""

from __future__ import annotations

import numpy as np

from ident.errors import NotIdentifiable
from ident.estimate.columns import columns
from ident.estimate.layout import Layout
from ident.estimate.point import Point
from ident.estimate.refine import refine
from ident.evidence.criteria import fit_percent
from ident.evidence.normal import solve_normal

TRAINED = 0.7  # share of the rows that the model is fitted on
ROUGHLY = 1e-2  # of one residual's variance: a tenth of a standard deviation is enough here
SHORT = 0.2  # of a time constant or of a sample's dead time: within it the slopes tell what a refit would
MOVES = 0.2  # of the command's whole span: what each part must move


def validation_fit(layout: Layout, at: Point) -> float | None:
    """NRMSE fit, %, of a simulation over the last rows by a model fitted to the first.

    None where one of the two parts does not move enough to say anything.
    """
    row = int(TRAINED * layout.rows)
    if layout.colour.white and _moves(layout, row):
        near = _linearised(layout, at, row)
        if near is not None:
            return near
    train, row = layout.leading(row)
    if train is None or not _moves(layout, row):
        return None
    try:
        trained = refine(train.whitened(layout.colour), at.shape, at.L, ROUGHLY)
    except (NotIdentifiable, np.linalg.LinAlgError):
        return None
    # The same (T, L) on the whole record; gain, offset and known transients are the trained ones.
    whole = columns(layout, trained.shape, trained.L)
    response, offset_and_transients = whole.response, whole.nuisance
    known = len(trained.nuisance)
    base = trained.K * response + trained.nuisance @ offset_and_transients[:known]
    # A stretch that begins later has an initial state of its own: taken from that stretch.
    for transient in offset_and_transients[known:]:
        rest = layout.speed - base
        base = base + float(transient @ rest) / float(transient @ transient) * transient
    return fit_percent(layout.speed[row:], base[row:])


def _linearised(layout: Layout, at: Point, row: int) -> float | None:
    """The same by one Gauss-Newton step from the fit of all rows; None where that step is too long to be trusted."""
    k, known = at.log_count, at.jacobian[:, :row]
    step = solve_normal(known @ known.T, known @ at.residual[:row])
    if max(np.abs(step[1 : 1 + k]).max(), abs(float(step[1 + k])) / layout.step) > SHORT:
        return None
    left = at.raw[row:] - step @ at.jacobian[:, row:]
    return fit_percent(layout.speed[row:], layout.speed[row:] - left)


def _moves(layout: Layout, row: int) -> bool:
    command = np.concatenate([s.command[s.skip :] for s in layout.stretches])
    span = float(np.ptp(command))
    return min(float(np.ptp(command[:row])), float(np.ptp(command[row:]))) >= MOVES * span
