"""Friction: dry friction per direction of motion, as it follows from a fit with the direction as an input."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ident.estimate.layout import Layout
from ident.estimate.point import Point
from ident.evidence import Estimate
from ident.evidence.colour import Colour, coloured_covariance, inverse_gram
from ident.evidence.estimates import NORMAL_95
from ident.findings import Finding
from ident.record.segments import Floats


@dataclass(frozen=True, slots=True)
class Friction:
    """Dry friction per direction, in command units, above 0 where it opposes the motion.

    What the command must exceed, from its own zero, to keep the motor turning: a steady load is in both, with opposite
    signs. Where it helps more than friction opposes in one direction, both are the mean of the two.
    """

    forward: Estimate
    backward: Estimate


def friction_levels(layout: Layout, at: Point, colour: Colour, unit: str) -> Friction | None:
    """The levels of a fit in which the direction is an input, else None."""
    if not layout.rubbing:
        return None
    covariance = _covariance(layout, at, colour)
    by_sense = {sense: _level(layout, at, sense) for sense in (1.0, -1.0)}
    if min(value for value, _ in by_sense.values()) <= 0.0:
        by_sense = dict.fromkeys(by_sense, _mean(layout, at))
    return Friction(*(_estimate(value, slope, covariance, unit) for value, slope in by_sense.values()))


def mean_level(layout: Layout, at: Point, colour: Colour) -> tuple[float, float]:
    """The mean of both directions, above 0 where friction opposes the motion, and its std; command units."""
    value, slope = _mean(layout, at)
    return value, math.sqrt(max(float(slope @ _covariance(layout, at, colour) @ slope), 0.0))


def rubs(layout: Layout, at: Point, unit: str) -> Finding:
    """What dry friction in a log means for its user."""
    level = _mean(layout, at)[0]
    command = np.concatenate([s.command for s in layout.stretches]) + layout.command_level
    share = 100.0 * level / float(np.abs(command).max())
    return Finding(
        "dry-friction",
        "warning",
        f"Dry friction takes {level:.3g} {unit or 'command units'} of the command, {share:.0f} % of the largest in "
        "this log. K and T are those of the moving motor; spans at standstill were left out. Settings are for the "
        "moving motor too: about standstill a loop with integral action sticks and may hunt.",
        {"level": level, "percent_of_largest_command": share, "rows_used": layout.rows},
    )


def _level(layout: Layout, at: Point, sense: float) -> tuple[float, Floats]:
    """What the command must exceed in one direction of motion, and its slopes in the point's parameters."""
    # Settled: y = offset + K (u - u0) + step * sense, which is 0 at the command looked for.
    offset, along = float(at.nuisance[0]) + layout.speed_level, sense * math.copysign(1.0, at.K)
    slope = np.zeros(len(at.gram))
    if layout.drifting:
        middle = float(layout.clock.mean())
        offset += float(at.nuisance[1]) * middle
        slope[_row(at, 1)] = -along * middle / at.K
    beyond = (offset + float(at.nuisance[layout.first_transient - 1]) * sense) / at.K
    slope[0], slope[_row(at, 0)] = along * beyond / at.K, -along / at.K
    slope[_row(at, layout.first_transient - 1)] = -along * sense / at.K
    return along * (layout.command_level - beyond), slope


def _mean(layout: Layout, at: Point) -> tuple[float, Floats]:
    level = -float(at.nuisance[layout.first_transient - 1]) / abs(at.K)
    slope = np.zeros(len(at.gram))
    slope[0], slope[_row(at, layout.first_transient - 1)] = -level / at.K, -1.0 / abs(at.K)
    return level, slope


def _estimate(value: float, slope: Floats, covariance: Floats, unit: str) -> Estimate:
    std = math.sqrt(max(float(slope @ covariance @ slope), 0.0))
    return Estimate(value, std, (value - NORMAL_95 * std, value + NORMAL_95 * std), unit)


def _row(at: Point, nuisance: int) -> int:
    return 2 + at.log_count + nuisance


def _covariance(layout: Layout, at: Point, colour: Colour) -> Floats:
    rows, known = layout.rows, len(at.gram)
    if colour.white or not layout.colour.white:
        covariance = at.rss / rows * inverse_gram(at.gram)
    else:
        covariance = coloured_covariance(at.jacobian, colour)
    return np.asarray(covariance * rows / max(rows - known, 1))
