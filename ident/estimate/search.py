"""Search: from a log to the global least-squares FOPDT, coarse to fine.

A first look on block means gives a few (T, L). Each is followed through finer and finer block means, every cell
of the dead time in a window looked at on each level, down to the full record; the best is refined there, and its
neighbouring cells are looked at once more.
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
SETTLED = 0.1  # relative change of T below which a level has done its work
ENOUGH = 4000  # rows for a first look, where they show the answer plainly:
PLAIN = 1000.0  # times its own noise, in power
NEIGHBOURS = 6  # cells on either side of the refined minimum


def search(layout: Layout) -> Point:
    """The least-squares FOPDT of a layout: global over L up to half the longest stretch."""
    even = layout.evened()
    blocks = thinning(even)
    ends = [_follow(even, start.T, start.L, blocks) for start in _starts(even.thinned(blocks))]
    _, T, L = min(ends)
    return settle(layout, T, L)


def _starts(layout: Layout) -> tuple[Start, ...]:
    """Starts from the first rows alone, where those say it plainly; else from all of them."""
    if layout.rows > 2 * ENOUGH:
        head, rows = layout.leading(ENOUGH)
        if head is not None and float(np.ptp(np.concatenate([s.command for s in head.stretches]))) > 0.0:
            found = starts(head)
            if rows * found[0].explained > PLAIN * (1.0 - found[0].explained):
                return found
    return starts(layout)


def settle(layout: Layout, T: float, L: float) -> Point:
    """Refine from (T, L), then look at the neighbouring cells from the refined T and keep the least."""
    shape = FirstOrder(T)
    if not layout.uniform:
        h = layout.step
        return min((refine(layout, shape, L + s * h) for s in (-0.5, 0.0, 0.5)), key=lambda p: p.rss)
    best = refine(layout, shape, L)
    at = FirstOrder(best.shape.lags)
    rss, T_there, L_there = around(layout, at.T, best.L).minima()
    here = rss[int(best.L / layout.step) - max(int(best.L / layout.step) - NEIGHBOURS, 0)]
    i = int(np.argmin(rss))
    if rss[i] < here - 1e-9 * best.rss and abs(L_there[i] - best.L) > 0.5 * layout.step:
        nearby = float(np.clip(np.nan_to_num(T_there[i], nan=at.T), 0.5 * at.T, 2.0 * at.T))
        best = min(best, refine(layout, FirstOrder(nearby), float(L_there[i])), key=lambda p: p.rss)
    return best


def around(layout: Layout, T: float, L: float, neighbours: int = NEIGHBOURS) -> Cells:
    """The cells within `neighbours` of a dead time."""
    cell = int(L / layout.step)
    first = max(cell - neighbours, 0)
    return cells(layout, T, first, cell - first + neighbours + 1)


def _follow(layout: Layout, T: float, L: float, blocks: int) -> tuple[float, float, float]:
    """One start followed from block means of `blocks` rows to the full record: (rss, T, L)."""
    spacing = layout.step * blocks
    while True:
        level = layout.thinned(blocks)
        # The coarser level has already placed L within its cell.
        width = math.ceil(0.5 * spacing / level.step) + MARGIN
        rss, T, L = _settle_cells(level, T, L, width)
        if blocks == 1:
            return rss, T, L
        spacing = level.step
        blocks = max(blocks // FINER, 1)


def _settle_cells(layout: Layout, T: float, L: float, width: int) -> tuple[float, float, float]:
    """Alternate the best cell of the window and a step of T until both stay."""
    rss = math.inf
    for _ in range(MOST_ROUNDS):
        first = max(int(L / layout.step) - width, 0)
        values, T_there, L_there = cells(layout, T, first, 2 * width + 1).minima()
        i = int(np.argmin(values))
        rss, L = float(values[i]), float(L_there[i])
        T_next = float(T_there[i]) if np.isfinite(T_there[i]) and T_there[i] > 0 else 0.5 * T
        change = float(np.clip(math.log(T_next / T), -0.9, 0.9))
        T *= math.exp(change)
        at_edge = i == 2 * width or (i == 0 and first > 0)
        if abs(change) < SETTLED and not at_edge:
            break
        if not at_edge:
            width = min(width, MARGIN + 1)
    return rss, T, L
