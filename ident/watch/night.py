"""Night: one log's plant with its covariance, all that watching needs of a report."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from ident.errors import Refused
from ident.evidence import Covariance, Estimate, Statistics

NAMES = ("K", "T", "L")
ANSWERS = 1e-3  # input_correlation_p below which the residual answers to the command


class Estimated(Protocol):
    """A fit, or the part of a report that keeps one."""

    @property
    def parameters(self) -> Mapping[str, Estimate]:
        """Estimates by name."""

    @property
    def covariance(self) -> Covariance:
        """Of those parameters."""

    @property
    def statistics(self) -> Statistics:
        """How well they describe the log."""

    @property
    def friction(self) -> object | None:
        """Dry friction, where it was fitted."""


@dataclass(frozen=True, slots=True)
class Night:
    """K, T (s), L (s) of one log as a first-order plant, with their covariance in the same units and order.

    covariance   3 rows of 3
    gain_unit    of K; nights in different units are not compared
    misfit       the residual still answers to the command: the model leaves out something of the plant
    rubbing      dry friction was fitted: K and T are those of the moving motor, not of a linear compromise
    Raises Refused night-unusable.
    """

    K: float
    T: float
    L: float
    covariance: tuple[tuple[float, ...], ...]
    gain_unit: str = ""
    misfit: bool = False
    rubbing: bool = False

    def __post_init__(self) -> None:
        plant = (self.K, self.T, self.L)
        if not (all(map(math.isfinite, plant)) and self.K != 0 and self.T > 0 and self.L >= 0):
            raise Refused(
                "night-unusable",
                f"A night needs K finite and not 0, T > 0 and L >= 0; got K = {self.K}, T = {self.T}, L = {self.L}.",
            )
        matrix = np.array(self.covariance, dtype=np.float64)
        # Rounding may leave a variance of nothing just below it.
        if matrix.shape != (3, 3) or not np.isfinite(matrix).all() or (np.diagonal(matrix) < 0).any():
            raise Refused(
                "night-unusable",
                "A night needs the finite 3 by 3 covariance of K, T and L. "
                "Where the log bounds none, pass None for the night: it carries no news.",
            )

    @classmethod
    def of(cls, estimated: Estimated) -> Night:
        """Of a fit, or of the part of a report that keeps one.

        Raises Refused night-not-first-order.
        """
        values = {name: estimate.value for name, estimate in estimated.parameters.items()}
        unit = estimated.parameters["K"].unit if "K" in estimated.parameters else ""
        return cls.from_values(
            values,
            estimated.covariance.names,
            estimated.covariance.matrix,
            gain_unit=unit,
            input_correlation_p=estimated.statistics.input_correlation_p,
            rubbing=estimated.friction is not None,
        )

    @classmethod
    def from_values(
        cls,
        values: Mapping[str, float],
        names: Sequence[str],
        matrix: Sequence[Sequence[float | None]],
        *,
        gain_unit: str = "",
        input_correlation_p: float | None = None,
        rubbing: bool = False,
    ) -> Night:
        """Of a stored report's numbers: values by name, the covariance with the order of its names, a statistic, and
        whether dry friction was fitted.

        Raises Refused: night-not-first-order, night-unusable.
        """
        if not set(NAMES) <= set(values) or not set(NAMES) <= set(names):
            raise Refused(
                "night-not-first-order",
                f"Nights are compared by K, T and L; got {', '.join(values)}. "
                'Pass the fit whose model is "fopdt": every night must be of that one kind.',
            )
        order = [list(names).index(name) for name in NAMES]
        entries = [[matrix[i][j] for j in order] for i in order]
        covariance = tuple(tuple(math.nan if v is None else float(v) for v in row) for row in entries)
        K, T, L = (float(values[name]) for name in NAMES)
        misfit = input_correlation_p is not None and input_correlation_p < ANSWERS
        return cls(K, T, L, covariance, gain_unit, misfit, rubbing)
