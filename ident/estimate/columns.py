"""Columns: the response of a FOPDT's unit-gain part at the used rows, with its slopes in T and L."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.estimate.layout import Layout, Stretch
from ident.plants.hold import lag_gap, lag_gap_slope
from ident.record.segments import Floats


@dataclass(frozen=True, slots=True, eq=False)
class Columns:
    """At the used rows of a layout, for one (T, L).

    response             (rows,), the lag's answer to the delayed command, deviation from the command level
    slope_T, slope_L     (rows,), its derivatives per s
    nuisance             (1 + freed, rows): the offset, then a transient per freed stretch
    nuisance_slope_T     (1 + freed, rows), the derivatives of those per s
    """

    response: Floats
    slope_T: Floats
    slope_L: Floats
    nuisance: Floats
    nuisance_slope_T: Floats


def columns(layout: Layout, T: float, L: float) -> Columns:
    """All columns at (T, L); T > 0 and L >= 0 in s.

    At a kink (L a multiple of the step) slope_L is the one of the interval above L.
    """
    parts = [_delayed(s, T, L) for s in layout.stretches]
    response, slope_T, slope_L = (np.concatenate(c) if len(parts) > 1 else c[0] for c in zip(*parts, strict=True))
    nuisance, nuisance_slope_T = transients(layout, T)
    return Columns(response, slope_T, slope_L, nuisance, nuisance_slope_T)


def transients(layout: Layout, T: float) -> tuple[Floats, Floats]:
    """Offset and one exp(-t/T) per freed stretch at the used rows, with d/dT of each."""
    freed = layout.freed
    value = np.zeros((1 + len(freed), layout.rows))
    slope = np.zeros_like(value)
    value[0] = 1.0
    column, row = 1, 0
    for stretch in layout.stretches:
        n = stretch.rows - stretch.skip
        if stretch.start != "settled":
            time = stretch.time[stretch.skip :] - stretch.time[stretch.skip]
            decay = np.exp(-time / T)
            value[column, row : row + n] = decay
            slope[column, row : row + n] = decay * time / T**2
            column += 1
        row += n
    return value, slope


def _delayed(stretch: Stretch, T: float, L: float) -> tuple[Floats, Floats, Floats]:
    command, gap = stretch.command, lag_gap(stretch.command, stretch.intervals, T)
    gap_T = lag_gap_slope(gap, stretch.intervals, T)
    skip, n = stretch.skip, stretch.rows
    if stretch.step is not None:
        whole = int(L / stretch.step)  # samples; the rest is the fraction of one
        into = (whole + 1) * stretch.step - L  # from the held sample to the instant asked for
        decay: float | Floats = float(np.exp(-into / T))
        held, before = _shift(skip, n, whole + 1)
        u, q, q_T = (
            np.concatenate((np.full(before, fill), series[held])) if before else series[held]
            for series, fill in ((command, command[0]), (gap, 0.0), (gap_T, 0.0))
        )
        slope_in_decay: float | Floats = decay * into / T**2
    else:
        instant = stretch.time[skip:] - L
        index = np.searchsorted(stretch.time, instant, side="right") - 1
        early = index < 0
        index[early] = 0
        since = instant - stretch.time[index]
        since[early] = 0.0
        decay = np.exp(-since / T)
        u, q, q_T = command[index], gap[index], gap_T[index]
        slope_in_decay = decay * since / T**2
    return u + decay * q, decay * q_T + slope_in_decay * q, decay * q / T


def _shift(skip: int, n: int, shift: int) -> tuple[slice, int]:
    """Rows skip..n-1 moved back by `shift`: the slice that exists, and how many lie before the first row."""
    before = min(max(shift - skip, 0), n - skip)
    return slice(max(skip - shift, 0), n - shift if n > shift else 0), before
