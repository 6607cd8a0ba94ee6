"""Plausible plants: a seeded draw of the plants that a log allows."""

from __future__ import annotations

import math

import numpy as np

from ident.estimate.fit import Fit
from ident.estimate.second_order import SecondOrder
from ident.evidence.estimates import Covariance
from ident.plants import Fopdt, Sopdt, UnderdampedSopdt
from ident.plants.steps import Lagged
from ident.record.segments import Floats

FURTHEST = 3.0  # of a logarithm: a parameter off by more than e^3 is unknown, not plausible


def plausible(fit: Fit, rng: np.random.Generator, count: int) -> tuple[Lagged, ...]:
    """`count` plants drawn from a fit's uncertainty; () for models without one in these coordinates.

    log|K| and the logarithms of the time constants are normal, so neither changes sign; the dead time is drawn from its
    profile where there is one, else normal, and never below 0.
    """
    if fit.spread is None:
        return ()
    assert isinstance(fit.model, Lagged)
    L = _dead_times(fit, rng, count)
    return _drawn(fit.model, isinstance(fit.spread.shape, SecondOrder), fit.spread.log_covariance, L, rng)


def spread_of(fit: Fit) -> Covariance | None:
    """What `plausible_again` draws from, for a report: the covariance of log K, the other logarithms and L (s)."""
    if fit.spread is None:
        return None
    matrix = fit.spread.log_covariance
    times = ("log T",) if not isinstance(fit.spread.shape, SecondOrder) else ("log S", "log P")[: len(matrix) - 2]
    return Covariance(("log K", *times, "L"), tuple(tuple(float(v) for v in row) for row in matrix))


def plausible_again(model: Lagged, spread: Covariance, rng: np.random.Generator, count: int) -> tuple[Lagged, ...]:
    """The same from a report's model and spread. Its dead time is normal: a report keeps no profile to draw from."""
    covariance = np.array(spread.matrix)
    std = math.sqrt(max(float(covariance[-1, -1]), 0.0))
    L = np.maximum(model.L + std * rng.standard_normal(count), 0.0)
    return _drawn(model, not isinstance(model, Fopdt), covariance, L, rng)


def _drawn(model: Lagged, second: bool, covariance: Floats, L: Floats, rng: np.random.Generator) -> tuple[Lagged, ...]:
    """One plant for each dead time, the rest given it (Gaussian conditioning)."""
    rest, with_L, var_L = covariance[:-1, :-1], covariance[:-1, -1], max(float(covariance[-1, -1]), 1e-300)
    values, vectors = np.linalg.eigh(rest - np.outer(with_L, with_L) / var_L)
    root = vectors * np.sqrt(np.maximum(values, 0.0))
    z = (L - model.L)[:, None] * with_L / var_L + rng.standard_normal((len(L), len(rest))) @ root.T
    z = np.exp(np.clip(z, -FURTHEST, FURTHEST))
    K = model.K * z[:, 0]
    if isinstance(model, Fopdt) and not second:
        return tuple(Fopdt(*row) for row in zip(K.tolist(), (model.T * z[:, 1]).tolist(), L.tolist(), strict=True))
    assert not isinstance(model, Fopdt)
    S = model.S * z[:, 1]
    # Lags held equal have no logarithm of P of their own.
    P = model.P * z[:, 2] if len(rest) > 2 else S * S / 4.0
    return tuple(_pair(*row) for row in zip(K.tolist(), S.tolist(), P.tolist(), L.tolist(), strict=True))


def _dead_times(fit: Fit, rng: np.random.Generator, count: int) -> Floats:
    assert fit.spread is not None
    std = math.sqrt(max(float(fit.spread.log_covariance[-1, -1]), 0.0))
    if fit.profile is None:
        return np.maximum(fit.model.dead_time + std * rng.standard_normal(count), 0.0)
    # The profile's ratio of sums of squares to the likelihood that its own 95 % limit implies.
    weight = np.exp(-0.5 * 3.841 * np.log(fit.profile.ratio) / math.log(fit.profile.limit))
    grid = fit.profile.L
    steps = np.concatenate(([0.0], np.cumsum(np.diff(grid) * (weight[1:] + weight[:-1]) / 2.0)))
    return np.asarray(np.interp(rng.uniform(0.0, steps[-1], count), steps, grid))


def _pair(K: float, S: float, P: float, L: float) -> Sopdt | UnderdampedSopdt:
    root = S * S / 4.0 - P
    if root < 0.0:
        return UnderdampedSopdt(K, 1.0 / math.sqrt(P), S / (2.0 * math.sqrt(P)), L)
    T1 = S / 2.0 + math.sqrt(root)
    return Sopdt(K, T1, min(P / T1, T1), L)
