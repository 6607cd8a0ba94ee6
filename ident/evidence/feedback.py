"""Feedback: does a command answer to the speed? A test of causality on the data alone."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtrc

from ident.evidence.normal import solve_normal

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
    own, answer, target = [], [], []
    for u, y, r in zip(commands, speeds, setpoints or [None] * len(commands), strict=True):
        n = len(u)
        if n <= 4 * LAGS:
            continue
        past = [u[LAGS - i : n - i] for i in range(1, LAGS + 1)]
        # A setpoint may drive the command without any feedback, and its steps would hide what the speed adds.
        told = np.zeros(n) if r is None else r
        past += [told[LAGS - i : n - i] for i in range(LAGS + 1)]
        own.append(np.stack(past))
        answer.append(np.stack([y[LAGS - i : n - i] for i in range(LAGS + 1)]))
        target.append(np.diff(u)[LAGS - 1 :])
    if not own:
        return False
    X, Z, move = (_level(np.concatenate(part, axis=-1)) for part in (own, answer, target))
    alone, both = _unexplained(X, move), _unexplained(np.vstack((X, Z)), move)
    if alone <= 0.0:
        return False
    share = 1.0 - both / alone
    return share >= SHARE and float(chdtrc(len(Z), len(move) * share)) < CLEARLY


def _level(rows: Floats) -> Floats:
    """Less their means: levels far above the moves would cost digits."""
    return np.asarray(rows - rows.mean(axis=-1, keepdims=True))


def _unexplained(rows: Floats, target: Floats) -> float:
    rest = target - solve_normal(rows @ rows.T, rows @ target) @ rows
    return float(rest @ rest)
