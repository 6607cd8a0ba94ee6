"""Level: where the baseline nights lie, and how far they scatter beyond what their fits and healthy plants explain.

Nights of a plant that the model does not quite describe, logged under moves of different lengths, differ by more
than their covariances say. With z_i ~ N(level, D_i + X), D_i known, the scatter X has a moment estimate in closed
form. It is 0 with one night, and rank-deficient with few: what it lacks in nights the tests pay for in thresholds
(see `compare`). (Random effects by moments: DerSimonian and Laird 1986, Control. Clin. Trials 7, 177-188; several
dimensions: Jackson, White and Thompson 2010, Stat. Med. 29, 1282-1297; in two steps: DerSimonian and Kacker 2007,
Contemp. Clin. Trials 28, 105-114.)
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.record.segments import Floats


@dataclass(frozen=True, slots=True, eq=False)
class Level:
    """What the next night is compared with.

    z           (3,) precision-weighted mean of the baseline;  covariance  (3, 3) of that mean
    scatter     (3, 3) between nights, beyond what is known
    share       what part of `scatter` the mean itself carries: its covariance holds share * scatter
    degrees     of freedom behind `scatter`; 0 with one night, where it is taken as nothing
    """

    z: Floats
    covariance: Floats
    scatter: Floats
    share: float
    degrees: float


def level(z: Floats, known: Floats) -> Level:
    """The level of nights z (n, 3) with known covariances (n, 3, 3), all positive definite."""
    weight = _weights(known)
    # Where scatter dominates, a poor fit is as good a night as any: weights again, now with it.
    weight = _weights(known + _scatter(z, known, weight))
    scatter = _scatter(z, known, weight)
    share = float(weight @ weight)
    precision = np.linalg.inv(_scaled(known + scatter, size := _size(known + scatter)))
    total = np.linalg.inv(precision.sum(axis=0))
    mean = total @ np.einsum("nij,nj->i", precision, z / size) * size
    degrees = max(1.0 / share - 1.0, 1.0) if len(z) > 1 else 0.0
    return Level(mean, total * np.outer(size, size), scatter, share, degrees)


def _weights(known: Floats) -> Floats:
    """(n,) one weight a night, by how poor its covariance is against the mean of all."""
    size = _size(known)
    scaled = _scaled(known, size)
    poor = np.trace(np.linalg.solve(scaled.mean(axis=0), scaled), axis1=1, axis2=2)
    weight = 1.0 / poor
    return np.asarray(weight / weight.sum())


def _scatter(z: Floats, known: Floats, weight: Floats) -> Floats:
    """Moment estimate: sum w (z - zbar)(z - zbar)' has the expectation sum w (1 - w) (D_i + X)."""
    spread = weight * (1.0 - weight)
    if len(z) == 1:
        return np.zeros((3, 3))
    away = z - weight @ z
    beyond = ((weight * away.T) @ away - np.einsum("n,nij->ij", spread, known)) / spread.sum()
    # Scatter is never negative: cut in coordinates where what is known is the unit matrix.
    root = np.linalg.cholesky(known.mean(axis=0))
    values, vectors = np.linalg.eigh(np.linalg.solve(root, np.linalg.solve(root, beyond).T))
    along = root @ vectors
    return np.asarray((along * np.maximum(values, 0.0)) @ along.T)


def _size(covariances: Floats) -> Floats:
    """(3,) a scale for each coordinate, so that matrices of very unlike units can be inverted."""
    return np.asarray(np.sqrt(np.diagonal(covariances, axis1=1, axis2=2).mean(axis=0)))


def _scaled(covariances: Floats, size: Floats) -> Floats:
    return np.asarray(covariances / np.outer(size, size))
