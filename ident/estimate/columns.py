"""Columns: a shape's answer at the used rows, with its slopes, the offset and the transients."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ident.estimate.layout import Layout, Stretch
from ident.estimate.shape import Shape
from ident.record.segments import Floats

FORGOTTEN = 40.0  # time constants after which a free motion is below rounding


@dataclass(frozen=True, slots=True, eq=False)
class Moving:
    """Nuisances `first`... that move with the shape at the rows from `row` on: the transients of one stretch.

    slopes   (k, m, few), in the shape's logarithms; 0 after those rows
    """

    first: int
    row: int
    slopes: Floats


@dataclass(frozen=True, slots=True, eq=False)
class Columns:
    """At the used rows of a layout, for one shape and L.

    response     (rows,), deviation from the command level
    slopes       (k, rows), of the response in the shape's logarithms;  slope_L  (rows,), per s
    nuisance     (m, rows): the offset; the drift, the lead of reports on change and the answer to the direction of
                 motion where there are such; then the transients of each freed stretch
    transients   what of these moves with the shape, and how
    """

    response: Floats
    slopes: Floats
    slope_L: Floats
    nuisance: Floats
    transients: tuple[Moving, ...]

    def add_transients(self, amplitudes: Floats, to: Floats) -> None:
        """Add the slopes of the transients of these amplitudes (m,) to slopes (k, rows)."""
        for own in self.transients:
            m, few = own.slopes.shape[1:]
            to[:, own.row : own.row + few] += np.tensordot(amplitudes[own.first : own.first + m], own.slopes, (0, 1))


def columns(layout: Layout, shape: Shape, L: float) -> Columns:
    """All columns at a shape and L >= 0 in s, not whitened."""
    parts = [shape.answer(s, L) for s in layout.stretches]
    if len(parts) == 1:
        response, slopes, slope_L = parts[0]
    else:
        response, slopes, slope_L = (np.concatenate(c, axis=-1) for c in zip(*parts, strict=True))
    return Columns(response, slopes, slope_L, *_nuisance(layout, shape))


def _nuisance(layout: Layout, shape: Shape) -> tuple[Floats, tuple[Moving, ...]]:
    moving: list[Moving] = []
    values: list[Floats] = []
    first = column = layout.first_transient
    row = 0
    for stretch in layout.stretches:
        if stretch.start != "settled":
            time = stretch.time[stretch.skip :] - stretch.time[stretch.skip]
            few = int(np.searchsorted(time, FORGOTTEN * shape.slowest, side="right"))
            value, slopes = shape.transients(time[:few])
            values.append(value)
            moving.append(Moving(column, row, slopes))
            column += len(value)
        row += stretch.rows - stretch.skip
    nuisance = np.zeros((column, layout.rows))
    nuisance[0] = 1.0
    if layout.drifting:
        nuisance[1] = layout.clock
    if layout.on_change:
        nuisance[1 + layout.drifting] = layout.ahead
    if layout.rubbing:
        nuisance[first - 1], slopes = rubbed(layout, shape)
        moving.append(Moving(first - 1, 0, slopes[:, None]))
    at = first
    for value, own in zip(values, moving, strict=False):
        nuisance[at : at + len(value), own.row : own.row + value.shape[1]] = value
        at += len(value)
    return nuisance, tuple(moving)


def rubbed(layout: Layout, shape: Shape) -> tuple[Floats, Floats]:
    """The shape's answer (rows,) to the direction of motion, and its slopes (k, rows).

    Friction acts on the shaft itself: no dead time lies before it.
    """
    parts = [shape.answer(replace(s, command=_direction(s), straight=False), 0.0)[:2] for s in layout.stretches]
    answers, slopes = zip(*parts, strict=True)
    return np.concatenate(answers), np.concatenate(slopes, axis=-1)


def _direction(stretch: Stretch) -> Floats:
    assert stretch.direction is not None
    return stretch.direction
