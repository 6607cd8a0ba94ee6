"""Feedback: does a command answer to the speed? A test of causality on the data alone."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtrc

from ident.evidence.normal import gram_of, solve_normal

Floats = NDArray[np.float64]

SHARE = 0.02  # of the command's moves that the speed must explain
CLEARLY = 1e-6
LAGS = 3


def feedback(commands: list[Floats], speeds: list[Floats], setpoints: list[Floats | None] | None = None) -> bool:
    """Whether the command's moves follow from present and past speeds beyond its own past and the setpoint.

    In an open loop the speed answers to earlier commands only, so given those it says nothing of the next move
    (Granger 1969, Econometrica 37, 424-438). Runs of rows without a gap, (n,) each; a setpoint where it is known.
    """
    moves = np.concatenate([np.diff(u) for u in commands])
    if not np.any(moves):
        return False
    setpoints = setpoints or [None] * len(commands)
    # A setpoint may drive the command without any feedback, and its steps would hide what the speed adds.
    told = any(r is not None for r in setpoints)
    parts = [
        _with_past(u, y, np.zeros(len(u)) if r is None and told else r)
        for u, y, r in zip(commands, speeds, setpoints, strict=True)
        if len(u) > 4 * LAGS
    ]
    if not parts:
        return False
    rows = parts[0] if len(parts) == 1 else np.concatenate(parts, axis=1)
    rows -= rows.mean(axis=1, keepdims=True)  # levels far above the moves would cost digits
    gram = gram_of(rows)
    answer = LAGS + 1
    alone, both = (_unexplained(rows, gram, own) for own in (len(rows) - 1 - answer, len(rows) - 1))
    if alone <= 0.0:
        return False
    share = 1.0 - both / alone
    return share >= SHARE and float(chdtrc(answer, rows.shape[1] * share)) < CLEARLY


def _with_past(u: Floats, y: Floats, r: Floats | None) -> Floats:
    """Past commands, setpoints where there are any, speeds, and last the next move: rows of one run."""
    n = len(u)
    series = [u[LAGS - i : n - i] for i in range(1, LAGS + 1)]
    for known in (r, y):
        if known is not None:
            series += [known[LAGS - i : n - i] for i in range(LAGS + 1)]
    return np.stack([*series, np.diff(u)[LAGS - 1 :]])


def _unexplained(rows: Floats, gram: Floats, own: int) -> float:
    """Sum of squares that the first `own` rows leave of the last."""
    rest = rows[-1] - solve_normal(gram[:own, :own], gram[:own, -1]) @ rows[:own]
    return float(rest @ rest)
