"""Estimate and Covariance: a number that says how well it is known."""

from __future__ import annotations

from dataclasses import dataclass

NORMAL_95 = 1.959963984540054


@dataclass(frozen=True, slots=True)
class Estimate:
    """A parameter with its standard deviation and 95 % interval, all in `unit`.

    std     None where the log does not bound it
    ci95    (low, high); None on a side that the log leaves open
    """

    value: float
    std: float | None
    ci95: tuple[float | None, float | None]
    unit: str


@dataclass(frozen=True, slots=True)
class Covariance:
    """Covariance of the parameters, rows and columns in the order of `names`, in their units."""

    names: tuple[str, ...]
    matrix: tuple[tuple[float, ...], ...]
