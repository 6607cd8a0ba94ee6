"""Search: from a log to the global least-squares FOPDT, coarse to fine.

A first look on block means, or on the first of them where those say it plainly, gives a few (T, L). Each is settled
there and followed through finer and finer block means, every cell of the dead time in a window looked at on each level,
down to the full record; the best is refined there, and its neighbouring cells are looked at once more.
"""

from __future__ import annotations

import math

import numpy as np

from ident.estimate.cells import Cells, cells
from ident.estimate.first_order import FirstOrder
from ident.estimate.layout import Layout
from ident.estimate.point import Point
from ident.estimate.refine import refine
from ident.estimate.start import Start, starts, thinning

FINER = 8  # block means shrink by this factor from level to level
MARGIN = 2  # cells beyond the window that a level's resolution asks for
MOST_ROUNDS = 6
SETTLED = 0.1  # relative change of T below which the first level has done its work
PLACED = 0.5  # the same on a finer level, whose T is close from the start and refined afterwards
ENOUGH = 2000  # rows for a first look, where they show the answer plainly:
PLAIN = 1000.0  # times its own noise, in power
NEIGHBOURS = 6  # cells on either side of the refined minimum


def search(layout: Layout) -> tuple[Point, Cells | None]:
    """The least-squares FOPDT of a layout, global over L up to half the longest stretch, and the cells about it."""
    even = layout.evened()
    blocks = thinning(even)
    level, found = _starts(even.thinned(blocks))
    ends = [_follow(even, level, start, blocks) for start in found]
    _, T, L = min(ends)
    return settle(layout, T, L)


def _starts(layout: Layout) -> tuple[Layout, tuple[Start, ...]]:
    """Starts from the first rows alone, where those say it plainly, else from all of them; and the rows looked at."""
    if layout.rows > 2 * ENOUGH:
        head, rows = layout.leading(ENOUGH)
        if head is not None and float(np.ptp(np.concatenate([s.command for s in head.stretches]))) > 0.0:
            found = starts(head)
            if rows * found[0].explained > PLAIN * (1.0 - found[0].explained):
                return head, found
    return layout, starts(layout)


def settle(layout: Layout, T: float, L: float) -> tuple[Point, Cells | None]:
    """Refine from (T, L), then look at the neighbouring cells from the refined T and keep the least.

    The cells are those about the point, at its T; None where the rows are not on one grid or the point has moved on.
    """
    shape = FirstOrder(T)
    if not layout.uniform:
        h = layout.step
        return min((refine(layout, shape, L + s * h) for s in (-0.5, 0.0, 0.5)), key=lambda p: p.rss), None
    best = refine(layout, shape, L)
    at = FirstOrder(best.shape.lags)
    window = around(layout, at.T, best.L)
    rss, T_there, L_there = window.minima()
    here = rss[int(best.L / layout.step) - window.first]
    i = int(np.argmin(rss))
    if rss[i] < here - 1e-9 * best.rss and abs(L_there[i] - best.L) > 0.5 * layout.step:
        nearby = float(np.clip(np.nan_to_num(T_there[i], nan=at.T), 0.5 * at.T, 2.0 * at.T))
        other = refine(layout, FirstOrder(nearby), float(L_there[i]))
        if other.rss < best.rss:
            return other, None
    return best, window


def around(layout: Layout, T: float, L: float, neighbours: int = NEIGHBOURS) -> Cells:
    """The cells within `neighbours` of a dead time."""
    cell = int(L / layout.step)
    first = max(cell - neighbours, 0)
    return cells(layout, T, first, cell - first + neighbours + 1)


def _follow(layout: Layout, level: Layout, start: Start, blocks: int) -> tuple[float, float, float]:
    """One start settled on its level, of `blocks` rows to a mean, and followed to the full record: (rss, T, L)."""
    rss, T, L = _settle_cells(level, start.T, start.L, 1, SETTLED)
    finer = [] if blocks > 1 or level.rows == layout.rows else [1]
    while blocks > 1:
        blocks = max(blocks // FINER, 1)
        finer.append(blocks)
    for blocks in finer:
        spacing = level.step
        level = layout.thinned(blocks)
        # The coarser level has already placed L within its cell.
        rss, T, L = _settle_cells(level, T, L, math.ceil(0.5 * spacing / level.step), PLACED)
    return rss, T, L


def _settle_cells(layout: Layout, T: float, L: float, width: int, settled: float) -> tuple[float, float, float]:
    """Alternate the best cell, of those `width` and MARGIN on either side, and a step of T until both stay."""
    rss = math.inf
    width += MARGIN
    for _ in range(MOST_ROUNDS):
        first = max(int(L / layout.step) - width, 0)
        values, T_there, L_there = cells(layout, T, first, 2 * width + 1).minima()
        i = int(np.argmin(values))
        rss, L = float(values[i]), float(L_there[i])
        T_next = float(T_there[i]) if np.isfinite(T_there[i]) and T_there[i] > 0 else 0.5 * T
        change = float(np.clip(math.log(T_next / T), -0.9, 0.9))
        T *= math.exp(change)
        at_edge = i == 2 * width or (i == 0 and first > 0)
        if abs(change) < settled and not at_edge:
            break
        if not at_edge:
            width = min(width, MARGIN + 1)
    return rss, T, L
