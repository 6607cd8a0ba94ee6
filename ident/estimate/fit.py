"""Fit: a model with its uncertainty, how well it describes the log, and what was noticed on the way."""

from __future__ import annotations

from dataclasses import dataclass

from ident.estimate.driven import Driven
from ident.estimate.friction import Friction
from ident.estimate.shape import Shape
from ident.evidence import Covariance, Estimate, Statistics
from ident.evidence.colour import Colour
from ident.findings import Finding
from ident.plants import Arx, Fopdt, Sopdt, UnderdampedSopdt
from ident.record.segments import Floats


@dataclass(frozen=True, slots=True, eq=False)
class DeadTimeProfile:
    """Sum of squares over its minimum along the dead time, everything else refitted.

    L      (m,), s;  ratio  (m,), >= 1;  limit  the ratio that bounds the 95 % interval
    """

    L: Floats
    ratio: Floats
    limit: float


@dataclass(frozen=True, slots=True, eq=False)
class Spread:
    """Where plausible plants are drawn: the shape, and the covariance of log|K|, its logarithms and L (s)."""

    shape: Shape
    log_covariance: Floats


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """One fitted model.

    parameters   {name: Estimate}, the model's own, in its order
    derived      what follows from them: "K/T", per s
    covariance   of the parameters, coloured residuals accounted for
    driven       what was moved on purpose in the log, and how well that alone tells the plant; None where not asked
    noise        the colour of what the model leaves, None where not kept
    simulated    (rows of the record,), the model's response to the logged command; NaN on rows not used
    friction_speed  the same, what dry friction adds to it; None where none is fitted
    """

    name: str
    model: Fopdt | Sopdt | UnderdampedSopdt | Arx
    parameters: dict[str, Estimate]
    derived: dict[str, Estimate]
    covariance: Covariance
    friction: Friction | None
    statistics: Statistics
    findings: tuple[Finding, ...]
    simulated: Floats
    profile: DeadTimeProfile | None
    spread: Spread | None = None
    driven: Driven | None = None
    noise: Colour | None = None
    friction_speed: Floats | None = None
