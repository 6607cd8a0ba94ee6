"""Dry friction: a force against the motion that does not grow with speed (Coulomb).

The direction of motion is a second input, without the command's dead time: y = K G(s) (exp(-L s) u - F sign(y)). A
linear fit gives half the gain where friction takes half the command. (Armstrong-Hélouvry, Dupont and Canudas de Wit
1994, Automatica 30, 1083-1138; a known function of a measured signal as one more input: Ljung 1999, section 5.2.)
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace

import numpy as np

from ident.estimate.coloured import coloured
from ident.estimate.columns import rubbed
from ident.estimate.crossings import follow
from ident.estimate.first_order import FirstOrder
from ident.estimate.friction import mean_level, rubs
from ident.estimate.layout import Layout
from ident.estimate.levels import level_varies
from ident.estimate.point import Point
from ident.estimate.refine import refine
from ident.estimate.second_order import SecondOrder
from ident.estimate.standstill import lingering, motion, moving, noise
from ident.evidence.colour import noise_colour
from ident.evidence.normal import gram_of, solve_normal
from ident.findings import Finding

CLEAR = 6.0  # standard deviations of the level, the residuals' colour accounted for
NOTABLE = 0.02  # of the command's std: less friction changes no setting
GLANCE = 0.25 * NOTABLE  # the same by the linear fit's slopes alone: less is not looked into
SLOW = 0.2  # of the speed's rms: slower rows may stand, and do not count when friction is looked for
BOTH_WAYS = 0.02  # share of the rows that must be faster than that in either direction
STARTS = (1.0, 2.0)  # times the linear fit's T: friction makes a motor look quicker than it is
ROUGHLY = 1e-3  # of one residual's variance: enough while the direction is not settled
UNLIKE = 0.05  # P/S^2 of the unlike lags at which a second one is looked for


def turning(
    layout: Layout, at: Point, unit: str, closed: Callable[[], bool]
) -> tuple[Layout, Point, tuple[Finding, ...]]:
    """The layout and the first-order point with dry friction where the data ask for it, else both as they are.

    closed  whether the command answers to the speed; asked for only where it matters. The direction then goes with the
            noise as the command does, and counts only beside a model of the noise.

    A direction that *helps* the motion is no friction; a gain that varies with level does that, and is a finding.
    """
    if layout.on_change or not _asked_for(layout, at):
        return layout, at, ()
    rubbing = rub(layout, at)
    if rubbing is None:
        return layout, at, ()
    feedback = closed()
    if clear_level(*(coloured(*rubbing) if feedback else rubbing)) > CLEAR and survives_second_lag(*rubbing):
        return *rubbing, (rubs(*rubbing, unit),)
    return layout, at, level_varies(layout, at, unit) if not feedback and clear_level(*rubbing) < 0.0 else ()


def _asked_for(layout: Layout, at: Point) -> bool:
    """Whether the motor turns both ways, and its direction explains some of what the linear fit leaves as it moves."""
    whole = np.concatenate([s.speed for s in layout.stretches]) + layout.speed_level
    slow = SLOW * float(np.sqrt(np.mean(whole**2)))
    # Noise about a standstill turns both ways as well.
    if min(float(np.mean(whole > slow)), float(np.mean(whole < -slow))) < BOTH_WAYS:
        return False
    # Where noise alone passes for motion the direction is not known.
    if noise(whole) > slow:
        return False
    senses = np.split(np.clip(whole / slow, -1.0, 1.0), np.cumsum([s.rows for s in layout.stretches])[:-1])
    seen = replace(
        layout, stretches=tuple(replace(s, direction=d) for s, d in zip(layout.stretches, senses, strict=True))
    )
    moves = np.abs(layout.speed + layout.speed_level) > slow
    # Slow rows count for nothing.
    gram = gram_of(np.vstack((at.jacobian, rubbed(seen, at.shape)[0], at.raw)) * moves)
    onto = solve_normal(gram[:-2, :-2], gram[:-2, -2])
    own = float(gram[-2, -2] - onto @ gram[:-2, -2])
    left = float(gram[-1, -1] - gram[:-2, -1] @ solve_normal(gram[:-2, :-2], gram[:-2, -1]))
    toward = float(gram[-2, -1] - onto @ gram[:-2, -1])
    if own <= 0.0 or toward**2 / own <= CLEAR**2 * left / int(np.count_nonzero(moves)):
        return False
    # In a very long log next to nothing is clear.
    command = np.concatenate([s.command[s.skip :] for s in layout.stretches])
    return abs(toward) > GLANCE * own * abs(at.K) * float(command.std())


def rub(layout: Layout, at: Point) -> tuple[Layout, Point] | None:
    """The spans of motion with the direction as a second input, fitted; None where the motor does not turn both ways.

    at  the linear first-order fit
    """
    seen = motion(layout, at.shape.lags + at.L)
    if seen is None:
        return None
    spans = moving(layout, seen, lingering(layout, seen))
    if spans is None:
        return None
    tries = [refine(spans, FirstOrder(start * at.shape.lags), at.L, ROUGHLY) for start in STARTS]
    return follow(spans, min(tries, key=lambda p: p.rss))


def clear_level(layout: Layout, at: Point) -> float:
    """The level of friction in standard deviations, above 0 where it opposes the motion; 0 where it is negligible."""
    if at.K == 0.0:
        return 0.0
    level, std = mean_level(layout, at, noise_colour(layout.parts(at.raw)) if layout.colour.white else layout.colour)
    command = np.concatenate([s.command[s.skip :] for s in layout.stretches])
    if abs(level) < NOTABLE * float(command.std()):
        return 0.0
    return level / std if std > 0.0 else math.copysign(math.inf, level)


def survives_second_lag(layout: Layout, at: Point) -> bool:
    """Whether friction opposes clearly beside a second time constant too, which can look like it."""
    S = at.shape.lags + at.L
    tries = (SecondOrder(S, UNLIKE * S * S), SecondOrder(S, 0.25 * S * S))
    best = min((refine(layout, shape, 0.0, ROUGHLY) for shape in tries), key=lambda p: p.rss)
    return best.rss > at.rss or clear_level(layout, best) > CLEAR
