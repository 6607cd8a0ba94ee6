"""Orders: every ARX order and delay weighed from one Gram matrix.

All candidates are judged on the same rows, those with the longest history of any of them. Least squares on a subset
of columns needs only the same subset of the Gram matrix, and with the past speeds put last one small factor gives all
numbers of past speeds at once. Chosen is the least BIC, n ln(RSS/n) + p ln n: among hundreds of candidates AICc keeps
terms that are only lucky. A constant is fitted in all of them.

Squaring costs half the digits, and speeds sampled fast are nearly alike. So the speed's change takes the place of the
speed, and successive differences that of the past speeds: they span the same models and keep the digits.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ident.errors import NotIdentifiable
from ident.estimate.lagged import Run, Runs
from ident.evidence.normal import lengths
from ident.record.segments import Floats

MOST_A, MOST_B, MOST_DELAY = 4, 4, 21
DEPENDENT = 1e-7  # of a column's length: what is left of it is rounding
EXACT = 1e-13  # of the changes' sum of squares: a smaller rest is rounding
CHUNK = 16_384  # rows at a time


@dataclass(frozen=True, slots=True, eq=False)
class Orders:
    """The chosen orders, and the sum of squares over all delays at these na and nb (delays 1, 2, ...)."""

    na: int
    nb: int
    delay: int
    over_delay: Floats
    rows: int


def search_orders(runs: Runs) -> Orders:
    """The ARX orders na and nb 1..4 and delay 1..21 with the least BIC; the delay at most a quarter of a run.

    Raises NotIdentifiable too-short.
    """
    delays = max(min(MOST_DELAY, max(r.rows for r in runs.runs) // 4), 1)
    skip = max(MOST_A, delays + MOST_B - 1)
    n, columns = runs.rows(skip), 2 + skip + MOST_A
    if n < 2 * columns:
        raise NotIdentifiable(
            "too-short",
            f"The search for ARX orders needs {2 * columns} rows after {skip} rows of history, this log has {n}: log "
            "longer without gaps, or give the orders.",
            {"rows_with_history": n, "needed": 2 * columns},
        )
    gram = sum((_gram(run, skip) for run in runs.runs if run.rows > skip), np.zeros((columns, columns)))
    rss = np.maximum(_sums_of_squares(gram, delays), max(EXACT * gram[-1, -1], n * runs.smallest**2))
    terms = np.arange(1, MOST_A + 1)[:, None, None] + np.arange(1, MOST_B + 1)[:, None]
    na, nb, delay = np.unravel_index(int(np.argmin(n * np.log(rss / n) + terms * math.log(n))), rss.shape)
    return Orders(int(na) + 1, int(nb) + 1, int(delay) + 1, rss[na, nb], n)


def _gram(run: Run, skip: int) -> Floats:
    """Gram matrix of 1, u[k-1] .. u[k-skip], y[k-1], its successive differences back in time, y[k] - y[k-1]."""
    past = [run.speed]
    for _ in range(1, MOST_A):
        past.append(np.diff(past[-1]))
    change, total = np.diff(run.speed), np.zeros(())
    for start in range(skip, run.rows, CHUNK):
        stop = min(start + CHUNK, run.rows)
        X = np.empty((2 + skip + MOST_A, stop - start))
        X[0] = 1.0
        for lag in range(1, skip + 1):
            X[lag] = run.command[start - lag : stop - lag]
        for i, difference in enumerate(past):
            # A difference of order i at row k - 1 stands at index k - 1 - i.
            X[1 + skip + i] = difference[start - 1 - i : stop - 1 - i]
        X[-1] = change[start - 1 : stop - 1]
        total = total + X @ X.T
    return np.asarray(total)


def _sums_of_squares(gram: Floats, delays: int) -> Floats:
    """(na, nb, delay) least sums of squares."""
    size = lengths(gram)
    values, vectors = np.linalg.eigh(gram / (size[:, None] * size))
    # A square root of the Gram matrix stands for the rows themselves.
    root = np.sqrt(np.maximum(values, 0.0))[:, None] * vectors.T
    change, past = gram.shape[0] - 1, range(gram.shape[0] - 1 - MOST_A, gram.shape[0] - 1)
    rss = np.empty((MOST_A, MOST_B, delays))
    for nb in range(1, MOST_B + 1):
        pick = np.array([[0, *(1 + d + j for j in range(nb)), *past, change] for d in range(delays)])
        small = np.asarray(np.linalg.qr(root[:, pick].transpose(1, 0, 2), mode="r"))
        square = small[:, :, -1] ** 2
        # A column that depends on those before it leaves a direction of rounding, which explains nothing.
        idle = np.abs(np.diagonal(small, axis1=1, axis2=2)) <= DEPENDENT
        for na in range(1, MOST_A + 1):
            own = 1 + nb + na
            rss[na - 1, nb - 1] = square[:, own:].sum(axis=1) + (square * idle)[:, :own].sum(axis=1)
    return np.asarray(rss * size[-1] ** 2)
