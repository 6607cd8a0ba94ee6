"""Search: from a log to the global least-squares FOPDT, coarse to fine.

A first look on block means, or on the first of them where those say it plainly, gives a few (T, L). Each is settled
there and followed through finer and finer block means, every cell of the dead time in a window looked at on each level,
down to the full record; the best is refined there, and its neighbouring cells are looked at once more.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

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
SETTLED = 0.1  # change of log T below which the first level has done its work
PLACED = 0.5  # the same on a finer level, whose T is close from the start and refined afterwards
ENOUGH = 2000  # rows for a first look, where they show the answer plainly:
PLAIN = 1000.0  # times its own noise, in power
SAME = 0.05  # of one residual's variance: a difference in the sum of squares that says nothing
NEIGHBOURS = 6  # cells on either side of the refined minimum


@dataclass(frozen=True, slots=True, eq=False)
class Place:
    """(T, L), s, of the least sum of squares `rss` among the cells of a level of so many rows, `window` the last."""

    T: float
    L: float
    rss: float
    rows: int
    window: Cells


def search(layout: Layout) -> Place:
    """Where the least-squares FOPDT of a layout lies, global over L up to half the longest stretch."""
    even = layout.evened()
    blocks = thinning(even)
    level, found = _starts(even.thinned(blocks))
    places = [_follow(even, level, start, blocks) for start in found]
    if len(places) > 1 or not layout.uniform:
        places = [_closer(even, place) for place in places]
    return min(places, key=lambda place: place.rss)


def _starts(layout: Layout) -> tuple[Layout, tuple[Start, ...]]:
    """Starts from the first rows alone, where those say it plainly, else from all of them; and the rows looked at."""
    head = leading_part(layout)
    if head is not None:
        found = starts(head)
        if says_plainly(head, found[0].explained):
            return head, found
    return layout, starts(layout)


def leading_part(layout: Layout) -> Layout | None:
    """The first rows of a layout that has many more, where the command moves in them."""
    if layout.rows <= 2 * ENOUGH:
        return None
    head, _ = layout.leading(ENOUGH)
    moves = head is not None and float(np.ptp(np.concatenate([s.command for s in head.stretches]))) > 0.0
    return head if moves else None


def says_plainly(layout: Layout, explained: float) -> bool:
    """Whether rows of which a model explains this share of the speed's variance are enough for a first look."""
    return layout.rows * explained > PLAIN * (1.0 - explained)


def settle(layout: Layout, place: Place) -> tuple[Point, Cells | None]:
    """Look at every cell about a place, refine from the best, look at its neighbours and keep the least.

    The cells are those about the point, near its T; None where the rows are not on one grid or the point has moved on.
    """
    if not layout.uniform:
        shape, h = FirstOrder(place.T), layout.step
        tries = [refine(layout, shape, place.L + s * h) for s in (-0.5, 0.0, 0.5)]
        # Within a sample of a fast plant every dead time may do as well: of equals the longest, for care in the tuning.
        equal = min(p.rss for p in tries) * (1.0 + 1e-9)
        return max((p for p in tries if p.rss <= equal), key=lambda p: p.L), None
    near = _closer(layout, place)
    best = refine(layout, FirstOrder(near.T), near.L)
    at = FirstOrder(best.shape.lags)
    window = near.window if _agrees(near.window, best) else around(layout, at.T, best.L)
    rss, T_there, L_there = window.minima()
    here = rss[int(best.L / layout.step) - window.first]
    i = int(np.argmin(rss))
    if rss[i] < here - 1e-9 * best.rss and abs(L_there[i] - best.L) > 0.5 * layout.step:
        nearby = float(np.clip(np.nan_to_num(T_there[i], nan=at.T), 0.5 * at.T, 2.0 * at.T))
        other = refine(layout, FirstOrder(nearby), float(L_there[i]))
        if other.rss < best.rss:
            return other, None
    return best, window


def _agrees(window: Cells, at: Point) -> bool:
    """Whether cells at a nearby T, linear in its change, reach the point's sum of squares and lie well about it."""
    cell = int(at.L / window.step) - window.first
    if not (MARGIN <= cell or window.first == 0) or cell + MARGIN >= len(window.gram):
        return False
    rss, _ = window.profile(np.array([at.L]))
    return abs(float(rss[0]) - at.rss) <= SAME * at.rss / len(at.raw)


def around(layout: Layout, T: float, L: float, neighbours: int = NEIGHBOURS) -> Cells:
    """The cells within `neighbours` of a dead time."""
    cell = int(L / layout.step)
    first = max(cell - neighbours, 0)
    return cells(layout, T, first, cell - first + neighbours + 1)


def _follow(layout: Layout, level: Layout, start: Start, blocks: int) -> Place:
    """One start settled on its level, of `blocks` rows to a mean, and followed to the last before the full record."""
    place = _settle_cells(level, start.T, start.L, 1, SETTLED)
    while blocks > FINER:
        blocks //= FINER
        place = _closer(layout.thinned(blocks), place)
    return place


def _closer(layout: Layout, place: Place) -> Place:
    """A place on a finer level, where the coarser one has put L within its cell; as it is where it is on that level."""
    if place.rows == layout.rows:
        return place
    width = max(math.ceil(0.5 * place.window.step / layout.step), NEIGHBOURS)
    return _settle_cells(layout, place.T, place.L, width, PLACED)


def _settle_cells(layout: Layout, T: float, L: float, width: int, settled: float) -> Place:
    """Alternate the best cell, of those `width` and MARGIN on either side, and a step of T until both stay."""
    rss = math.inf
    width += MARGIN
    for _ in range(MOST_ROUNDS):
        first = max(int(L / layout.step) - width, 0)
        window = cells(layout, T, first, 2 * width + 1)
        values, T_there, L_there = window.minima()
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
    return Place(T, L, rss, layout.rows, window)
