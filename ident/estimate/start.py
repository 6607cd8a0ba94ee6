"""Start: a global first look at (T, L) on a thinned record, every dead time at once.

For each T of a coarse grid the lag's answer is correlated with the speed at every whole-sample dead time by one
fast Fourier transform; with the running sums of the answer this gives the share of the speed's variance that a
gain and an offset can explain. Transients wait for the fit itself.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import fft
from scipy.signal import lfilter

from ident.estimate.layout import Layout, Stretch
from ident.record.segments import Floats

FEWEST_ROWS = 1000  # never thin below
KEPT_VARIANCE = 0.98  # of the command, by its block means
GRID = 8  # time constants tried
LONGEST_DEAD_TIME = 0.5  # of the longest stretch
CANDIDATES = 3


@dataclass(frozen=True, slots=True)
class Start:
    """A first (T, L), s, and the share of the speed's variance explained there."""

    T: float
    L: float
    explained: float


def thinning(layout: Layout) -> int:
    """Rows per block mean: the most (a power of two) that keeps the command's variance and FEWEST_ROWS rows."""
    means = np.concatenate([s.command for s in layout.stretches])
    least = KEPT_VARIANCE * float(means.var())
    blocks = 1
    while layout.rows // (2 * blocks) >= FEWEST_ROWS:
        means = 0.5 * (means[0 : len(means) // 2 * 2 : 2] + means[1::2])
        if float(means.var()) < least:
            break
        blocks *= 2
    return blocks


def starts(layout: Layout) -> tuple[Start, ...]:
    """The best few starting points of a uniform layout without skipped rows, best first.

    Maxima over L that come near the best one.
    """
    h = layout.step
    longest = max(s.rows for s in layout.stretches)
    delays = max(int(LONGEST_DEAD_TIME * longest), 1)
    grid = np.geomspace(0.3 * h, 2.0 * longest * h, GRID)
    crossed = [_command_against_speed(s) for s in layout.stretches]
    explained = _explained(layout, crossed, grid, delays)
    best_T = explained.argmax(axis=0)
    over_L = explained.max(axis=0)
    rises = over_L >= np.concatenate(([-1.0], over_L[:-1]))
    falls = over_L >= np.concatenate((over_L[1:], [-1.0]))
    peaks = np.flatnonzero(rises & falls)
    peaks = peaks[np.argsort(-over_L[peaks], kind="stable")]
    share = over_L[peaks]
    near = peaks[(share >= 0.9 * share[0]) & (1.0 - share <= 2.0 * (1.0 - share[0]) + 1e-9)][:CANDIDATES]
    return tuple(Start(float(grid[best_T[d]]), float(d * h), float(over_L[d])) for d in near)


def _command_against_speed(stretch: Stretch) -> Floats:
    """Sum over the rows of v[k-d] y[k] for d = 0..n-1, v the command's deviation from its first value."""
    n = stretch.rows
    size = fft.next_fast_len(2 * n, real=True)
    moved = stretch.command - stretch.command[0]
    product = fft.irfft(np.conj(fft.rfft(moved, size)) * fft.rfft(stretch.speed, size), size)
    return np.asarray(product[:n], dtype=np.float64)


def _explained(layout: Layout, crossed: list[Floats], grid: Floats, delays: int) -> Floats:
    """Share of the speed's variance explained, (T of the grid, dead times 0..delays-1 in steps)."""
    x_sum, x_square, x_y = (np.zeros((len(grid), delays)) for _ in range(3))
    decays = np.exp(-layout.step / grid)
    for stretch, command_speed in zip(layout.stretches, crossed, strict=True):
        n, level = stretch.rows, float(stretch.command[0])
        some = min(delays, n)
        # The lag's answer is zero before the first row, so filtering the command and filtering its products
        # with the speed (backwards in d) give the same sums, and the transform is needed once for all T.
        last = float(command_speed[-1])
        both = np.stack((stretch.command - level, command_speed[::-1] - last))
        answers = np.stack([lfilter([0.0, 1.0 - a], [1.0, -a], both) for a in decays])
        moved = answers[:, 0]
        x_y[:, :some] += (answers[:, 1, n - some :] + last)[:, ::-1]
        # Delayed by d, the last d rows of the answer have not come by yet.
        moved_sum = np.cumsum(moved, axis=1)[:, n - some :][:, ::-1]
        moved_square = np.cumsum(moved * moved, axis=1)[:, n - some :][:, ::-1]
        x_sum[:, :some] += moved_sum
        x_square[:, :some] += moved_square + 2.0 * level * moved_sum
        # Where the level is not the reference, it adds to every dead time alike.
        x_y += level * float(stretch.speed.sum())
        x_sum += n * level
        x_square += n * level**2
    y = layout.speed
    covariance = x_y - x_sum * (float(y.sum()) / len(y))
    x_variance = x_square - x_sum**2 / len(y)
    y_variance = float(y @ y) - float(y.sum()) ** 2 / len(y)
    floor = 1e-12 * x_square.max(axis=1, keepdims=True) + 1e-300
    share = np.where(x_variance > floor, covariance**2 / np.maximum(x_variance * y_variance, 1e-300), 0.0)
    return np.asarray(share, dtype=np.float64)
