"""Cells: the sum of squared residuals over the dead time, one sample interval (cell) at a time.

In the cell d h <= L <= (d + 1) h the response at row k is u[k-d-1] + E q[k-d-1] with E = exp(-((d + 1) h - L)/T):
linear in E. With z = dq/dT as a third column, gain, dead time within the cell and a step of T therefore come from
one linear least-squares problem per cell, after offset and transients are projected out. Within a cell the sum
of squares is smooth; at its ends it has kinks, and minima of its own, so every cell of the window is looked at.

The products of the three columns with themselves are running sums, the same for all cells but for their ends,
so a cell costs three dot products with the speed and three per transient.
(Separable least squares: Golub and Pereyra 1973, SIAM J. Numer. Anal. 10, 413-432.)
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from ident.estimate.columns import FORGOTTEN
from ident.estimate.layout import Layout, Stretch
from ident.evidence.normal import RIDGE, gram_of, solve_normal
from ident.plants.hold import lag_gap, lag_gap_slope
from ident.record.segments import Floats

Ints = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Cells:
    """Normal equations per cell at one T, nuisance projected out.

    first       d of the first cell;  step  h, s;  T  s
    gram        (cells, 3, 3) of the columns u, q, z;  against  (cells, 3) with the speed
    total       sum of squares of the speed, nuisance projected out
    """

    first: int
    step: float
    T: float
    gram: Floats
    against: Floats
    total: float

    def minima(self) -> tuple[Floats, Floats, Floats]:
        """Per cell: least sum of squares, and the (T, L) where it lies, T linearised."""
        h, T = self.step, self.T
        b = solve_normal(self.gram, self.against)
        with np.errstate(all="ignore"):
            E = b[:, 1] / b[:, 0]
            T_new = T + b[:, 2] / b[:, 1]
            inside = (T_new > 0) & (E <= 1.0) & (E >= np.exp(-h / np.maximum(T_new, 1e-300)))
            into = np.where(inside, -T_new * np.log(np.where(inside, E, 1.0)), 0.0)
        rss = np.where(inside, self.total - np.einsum("ci,ci->c", b, self.against), np.inf)
        d = self.first + np.arange(len(rss))
        L = (d + 1) * h - into
        ends = np.stack((d * h, (d + 1) * h))
        rss_ends, T_ends = self.profile(ends.reshape(-1), np.concatenate((d, d)))
        for end, rss_end, T_end in zip(ends, rss_ends.reshape(2, -1), T_ends.reshape(2, -1), strict=True):
            better = rss_end < rss
            rss, L, T_new = np.where(better, rss_end, rss), np.where(better, end, L), np.where(better, T_end, T_new)
        return rss, np.asarray(T_new, dtype=np.float64), np.asarray(L, dtype=np.float64)

    def profile(self, L: Floats, cell: np.ndarray | None = None) -> tuple[Floats, Floats]:
        """Least sum of squares at each fixed L (s, within the window), and the T that attains it, linearised."""
        d = np.clip(np.floor(L / self.step).astype(int), self.first, None) if cell is None else cell
        i = np.minimum(d - self.first, len(self.gram) - 1)
        into = (self.first + i + 1) * self.step - L
        E = np.exp(-into / self.T)
        # Columns at fixed L: the response u + E q, and its slope in T, E z + E into/T^2 q.
        to_two = np.zeros((len(i), 3, 2))
        to_two[:, 0, 0] = 1.0
        to_two[:, 1, 0] = E
        to_two[:, 1, 1] = E * into / self.T**2
        to_two[:, 2, 1] = E
        gram = to_two.transpose(0, 2, 1) @ self.gram[i] @ to_two
        against = (self.against[i][:, None] @ to_two)[:, 0]
        b = solve_normal(gram, against)
        with np.errstate(all="ignore"):
            T = self.T + b[:, 1] / b[:, 0]
        return self.total - np.einsum("ci,ci->c", b, against), T


def cells(layout: Layout, T: float, first: int, count: int) -> Cells:
    """Normal equations of cells first..first+count-1 at T; the layout's stretches are uniform.

    Whitened by the layout's colour where it has one; the first rows, as many as its order, are then left out.
    """
    freed = layout.freed
    taps = layout.colour.taps
    level = float(taps.sum())  # what is left of a constant
    gram = np.zeros((count, 3, 3))
    against = np.zeros((count, 3))
    nuisance = np.zeros((count, 3, 1 + len(freed)))
    nuisance_gram = np.zeros((1 + len(freed),) * 2)
    nuisance_against = np.zeros(1 + len(freed))
    total = 0.0
    column = 0
    shifts = first + 1 + np.arange(count)
    for stretch in layout.stretches:
        skip = stretch.skip + layout.colour.order
        if skip >= stretch.rows:
            column += stretch.start != "settled"
            continue
        speed = _filtered(taps, stretch.speed[stretch.skip :])
        total += float(speed @ speed)
        nuisance_gram[0, 0] += level**2 * len(speed)
        nuisance_against[0] += level * float(speed.sum())
        weights = [speed]
        if stretch.start != "settled":
            column += 1
            time = stretch.time[stretch.skip :] - stretch.time[stretch.skip]
            few = max(int(np.searchsorted(time, FORGOTTEN * T)), len(taps))
            decay = _filtered(taps, np.exp(-time[:few] / T))
            weights.append(decay)
            nuisance_gram[0, column] = nuisance_gram[column, 0] = level * float(decay.sum())
            nuisance_gram[column, column] = decay @ decay
            nuisance_against[column] = decay @ speed[: len(decay)]
        own, sums, crossed = _stretch_products(stretch, T, shifts, skip, taps, weights)
        gram += own
        nuisance[:, :, 0] += level * sums
        against += crossed[0]
        if len(weights) > 1:
            nuisance[:, :, column] = crossed[1]
    # Project offset and transients out of everything.
    solve = np.linalg.solve(
        nuisance_gram + RIDGE * np.diag(np.diag(nuisance_gram)),
        np.concatenate([nuisance.reshape(count * 3, -1), nuisance_against[None]]).T,
    ).T
    onto, speed_onto = solve[:-1].reshape(count, 3, -1), solve[-1]
    return Cells(
        first,
        layout.step,
        T,
        gram - onto @ nuisance.transpose(0, 2, 1),
        against - nuisance @ speed_onto,
        total - float(nuisance_against @ speed_onto),
    )


def _filtered(taps: Floats, values: Floats) -> Floats:
    """Values passed through the taps, from the first row that has all of them."""
    return values if len(taps) == 1 else np.asarray(lfilter(taps, [1.0], values)[len(taps) - 1 :])


def _stretch_products(
    stretch: Stretch, T: float, shift: Ints, skip: int, taps: Floats, weights: list[Floats]
) -> tuple[Floats, Floats, list[Floats]]:
    """Gram (count, 3, 3), sums (count, 3) and products with each weight (count, 3) of the shifted columns."""
    n = stretch.rows
    gap = lag_gap(stretch.command, stretch.intervals, T)
    series = np.stack([stretch.command, gap, lag_gap_slope(gap, stretch.intervals, T)])
    history = np.array([stretch.command[0], 0.0, 0.0])  # before the first row: held and settled
    if len(taps) > 1:
        series = lfilter(taps, [1.0], series - history[:, None], axis=1) + float(taps.sum()) * history[:, None]
        history = float(taps.sum()) * history
    before = np.minimum(np.maximum(shift - skip, 0), n - skip)
    low, high = np.maximum(skip - shift, 0), np.maximum(n - shift, 0)
    high = np.maximum(high, low)
    # One more sample of dead time drops the last row of the range and takes one more at its start.
    whole = series[:, low[0] : high[0]]
    left, joined = series[:, high[-1] : high[0]][:, ::-1], series[:, low[-1] : low[0]][:, ::-1]
    dropped, taken = high[0] - high, low[0] - low
    own = _running(gram_of(whole), np.einsum("in,jn->nij", left, left), np.einsum("in,jn->nij", joined, joined))(
        dropped, taken
    )
    own += before[:, None, None] * np.outer(history, history)
    sums = _running(whole.sum(axis=1), left.T, joined.T)(dropped, taken) + before[:, None] * history
    crossed = []
    for weight in weights:
        begun = np.concatenate(([0.0], np.cumsum(weight[: int(before[-1])])))
        product = begun[np.minimum(before, len(weight))][:, None] * history
        lengths = np.minimum(len(weight) - before, high - low)
        for i, (lo, gone, length) in enumerate(zip(low.tolist(), before.tolist(), lengths.tolist(), strict=True)):
            if length > 0:
                product[i] += series[:, lo : lo + length] @ weight[gone : gone + length]
        crossed.append(product)
    return own, sums, crossed


def _running(whole: Floats, left: Floats, joined: Floats) -> Callable[[Ints, Ints], Floats]:
    """Sums over a range that has dropped rows at its end and taken rows at its start."""
    less, more = (np.concatenate((np.zeros((1, *whole.shape)), np.cumsum(change, axis=0))) for change in (left, joined))
    return lambda dropped, taken: whole - less[dropped] + more[taken]
