"""Crossings: where a motor with dry friction turns round, by its own model, and how the parameters move those instants.

The direction of motion follows from the speed, and the speed from the direction. Taken from the measured speed the
direction carries its noise; here both are of the model. At a crossing the friction turns, which changes the slope of
the speed, and what a parameter had done to the speed so far goes on changed by as much: for a first-order lag it is
multiplied by the ratio of the slopes (the saltation matrix of Aizerman and Gantmakher 1958; di Bernardo, Budd,
Champneys and Kowalczyk, Piecewise-smooth Dynamical Systems, 2008, section 2.5; from memory). Where friction holds the
motor the model crosses to and fro, and forgets its past.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ident.estimate.columns import FORGOTTEN, columns
from ident.estimate.layout import Layout, Stretch
from ident.estimate.point import Point
from ident.estimate.refine import refine
from ident.estimate.shape import Shape
from ident.evidence.normal import solve_normal
from ident.record.segments import Floats

MOST_STEPS = 30
MOST_HALVINGS = 6
PROMISE = 1e-6  # of one residual's variance: the descent ends when the next step promises less
ROUGHLY = 1e-3  # of the same, while directions are held
FORGETTING = 2  # x
MOST_ROUNDS, GAINED = 8, 1e-4  # a round in which the sum of squares falls by less than this share is the last
SLIVER = 1e-9  # of a direction: what keeps the first row's from changing its sign
BLOCK = 512  # rows looked through at a time


@dataclass(frozen=True, slots=True, eq=False)
class Turns:
    """Of one stretch, over its used rows: the last row before each crossing, and the slope of speed there, per s,
    0 where friction holds."""

    rows: tuple[int, ...]
    slopes: tuple[float, ...]


def follow(layout: Layout, at: Point) -> tuple[Layout, Point]:
    """The least-squares point whose directions are those of its own speed, from one with given directions.

    The slopes of the point it returns are those with moved crossings: its covariance is that of the whole model.
    """
    for _ in range(FORGETTING):
        layout, _ = _pointed(layout, at.shape, at.L, at.K, at.nuisance)
        at = refine(layout, at.shape, at.L, ROUGHLY)
    best: tuple[Layout, Point] | None = None
    for _ in range(MOST_ROUNDS):
        layout, own = _pointed(layout, at.shape, at.L, at.K, at.nuisance)
        layout, own = _descend(layout, own)
        if best is not None and own.rss > (1.0 - GAINED) * best[1].rss:
            return best if best[1].rss <= own.rss else (layout, own)
        best = layout, own
        # Crossings that small changes make and unmake stop a descent short; with these directions held it goes on.
        at = refine(layout, own.shape, own.L, ROUGHLY)
    assert best is not None
    return best


def _descend(layout: Layout, at: Point) -> tuple[Layout, Point]:
    """Gauss-Newton in all parameters, the directions following."""
    k = at.log_count
    for _ in range(MOST_STEPS):
        step = solve_normal(at.gram, at.toward)
        if float(2.0 * step @ at.toward - step @ at.gram @ step) <= PROMISE * at.rss / layout.rows:
            break
        for halving in range(MOST_HALVINGS):
            part = 0.5**halving * step
            shape, L = at.shape.moved(part[1 : 1 + k], layout), max(at.L + float(part[1 + k]), 0.0)
            trial = _pointed(layout, shape, L, at.K + float(part[0]), at.nuisance + part[2 + k :])
            if trial[1].rss < at.rss:
                layout, at = trial
                break
        else:
            break
    return layout, at


def _pointed(layout: Layout, shape: Shape, L: float, K: float, nuisance: Floats) -> tuple[Layout, Point]:
    """The model at given parameters, linear ones included, with the directions that follow from it."""
    own = columns(layout, shape, L)
    friction = layout.first_transient - 1
    step = float(nuisance[friction])
    without = K * own.response + nuisance @ own.nuisance - step * own.nuisance[friction] + layout.speed_level
    stretches, turns = [], []
    for s, speed in zip(layout.stretches, layout.parts(without), strict=True):
        turned, found = _turned(s, speed, shape, step)
        stretches.append(turned)
        turns.append(found)
    layout = replace(layout, stretches=tuple(stretches))
    own = columns(layout, shape, L)
    k = len(own.slopes)
    jacobian = np.empty((2 + k + len(own.nuisance), layout.rows))
    jacobian[0], jacobian[1 : 1 + k], jacobian[1 + k], jacobian[2 + k :] = (
        own.response,
        own.slopes,
        own.slope_L,
        own.nuisance,
    )
    moving = jacobian[1 : 2 + k]
    moving *= K
    own.add_transients(nuisance, moving[:k])
    raw = layout.speed - K * own.response - nuisance @ own.nuisance
    row = 0
    for s, found in zip(layout.stretches, turns, strict=True):
        n = s.rows - s.skip
        _carry(jacobian[:, row : row + n], s, found, shape, step)
        row += n
    at = Point(shape, L, K, nuisance, raw, raw, float(raw @ raw), jacobian, jacobian @ jacobian.T, jacobian @ raw)
    return layout, at


def _turned(stretch: Stretch, without: Floats, shape: Shape, step: float) -> tuple[Stretch, Turns]:
    """The stretch with the directions of a model whose speed without friction is given, (used rows,).

    step  what the friction of forward motion makes of the settled speed
    """
    assert stretch.direction is not None
    time = stretch.time[stretch.skip :]
    # Rows before the used ones only set the state at their start, which is free.
    sense = float(np.sign(stretch.direction[max(stretch.skip - 1, 0)])) or 1.0
    speed = without + step * sense
    turned = np.full(stretch.rows, sense)
    own = turned[stretch.skip :]
    rows: list[int] = []
    slopes: list[float] = []
    settled = 0.0  # what the turns so far make of the speed in the end
    at = _first(speed, 0, settled, sense)
    while at is not None and (k := _first(speed, at, settled, -sense)) is not None:
        here, there = float(speed[k - 1]) + settled, float(speed[k]) + settled
        pause = float(time[k] - time[k - 1])
        through = here * sense > 0.0
        # A motor that does not come through is held: it turns to and fro at the rows.
        share = here / (here - there) if through else 1.0
        rows.append(k - 1 if through else k)
        slopes.append((there - here) / pause if through else 0.0)
        few = k + int(np.searchsorted(time[k:], time[k] + FORGOTTEN * shape.slowest))
        change = -2.0 * sense * step
        speed[k:few] += change * (shape.step(time[k:few] - time[k - 1] - share * pause) - 1.0)
        settled += change
        if through:
            own[k - 1] = sense * max(2.0 * share - 1.0, -1.0 if k > 1 or stretch.skip else SLIVER)
        own[k:] = sense = -sense
        at = k if through else k + 1
    return replace(stretch, direction=turned), Turns(tuple(rows), tuple(slopes))


def _first(speed: Floats, start: int, settled: float, sense: float) -> int | None:
    """The first row from `start` whose speed has a sense."""
    for block in range(start, len(speed), BLOCK):
        there = (speed[block : block + BLOCK] + settled) * sense > 0.0
        k = int(np.argmax(there))
        if there[k]:
            return block + k
    return None


def _carry(slopes: Floats, stretch: Stretch, turns: Turns, shape: Shape, step: float) -> None:
    """Add to slopes (n, used rows) at fixed directions, in place, what the moved crossings do."""
    time = stretch.time[stretch.skip :]
    assert stretch.direction is not None
    sense = float(np.sign(stretch.direction[max(stretch.skip - 1, 0)]))
    most = float(shape.impulse(time - time[0]).max()) if turns.rows else 0.0
    for k, slope in zip(turns.rows, turns.slopes, strict=True):
        few = k + 1 + int(np.searchsorted(time[k + 1 :], time[k] + FORGOTTEN * shape.slowest))
        # Friction slows the motion after the crossing at most to standstill.
        share = -1.0 / most if slope == 0.0 else float(np.clip(-2.0 * sense * step * most / slope, -1.0, 0.0)) / most
        slopes[:, k + 1 : few] += share * slopes[:, k, None] * shape.impulse(time[k + 1 : few] - time[k])
        sense = -sense
