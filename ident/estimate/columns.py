"""Columns: a shape's answer at the used rows, with its slopes, the offset and the transients."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.estimate.layout import Layout
from ident.estimate.shape import Shape
from ident.record.segments import Floats


@dataclass(frozen=True, slots=True, eq=False)
class Columns:
    """At the used rows of a layout, for one shape and L.

    response          (rows,), deviation from the command level
    slopes            (k, rows), of the response in the shape's logarithms;  slope_L  (rows,), per s
    nuisance          (m, rows): the offset, the drift where there is one, then the transients of each freed stretch
    nuisance_slopes   (k, m, rows)
    """

    response: Floats
    slopes: Floats
    slope_L: Floats
    nuisance: Floats
    nuisance_slopes: Floats


def columns(layout: Layout, shape: Shape, L: float) -> Columns:
    """All columns at a shape and L >= 0 in s, not whitened."""
    parts = [shape.answer(s, L) for s in layout.stretches]
    if len(parts) == 1:
        response, slopes, slope_L = parts[0]
    else:
        response, slopes, slope_L = (np.concatenate(c, axis=-1) for c in zip(*parts, strict=True))
    nuisance, nuisance_slopes = _nuisance(layout, shape)
    return Columns(response, slopes, slope_L, nuisance, nuisance_slopes)


def _nuisance(layout: Layout, shape: Shape) -> tuple[Floats, Floats]:
    own = [
        shape.transients(s.time[s.skip :] - s.time[s.skip]) if s.start != "settled" else None for s in layout.stretches
    ]
    some = next((o for o in own if o is not None), None)
    first = 2 if layout.drifting else 1  # nuisances that do not move with the shape
    k, m = some[1].shape[:2] if some is not None else (1, 0)
    value = np.zeros((first + m * sum(o is not None for o in own), layout.rows))
    slope = np.zeros((k, *value.shape))
    value[0] = 1.0
    if layout.drifting:
        value[1] = layout.clock
    column, row = first, 0
    for stretch, mine in zip(layout.stretches, own, strict=True):
        end = row + stretch.rows - stretch.skip
        if mine is not None:
            value[column : column + m, row:end] = mine[0]
            slope[:, column : column + m, row:end] = mine[1]
            column += m
        row = end
    return value, slope
