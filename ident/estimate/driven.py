"""Driven: how much of the command's movement somebody caused on purpose, and what that part alone says of the plant.

In an open loop the command is moved by hand or by a test. Under feedback it also answers to load and noise: a model
fitted to that is identifiable in theory and a trap in practice, for its weight rests on the noise model alone. What
counts there is what the setpoint drives: the command projected on the setpoint passed through a bank of lags, the noise
being uncorrelated with it (the instrument of Söderström and Stoica 1983, Instrumental Variable Methods).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from ident.estimate.by_hand import hand_rows
from ident.estimate.columns import columns
from ident.estimate.ground import Found, Ground
from ident.estimate.layout import Layout, levelled
from ident.evidence.colour import coloured_covariance, inverse_gram
from ident.evidence.normal import solve_normal
from ident.plants.hold import lag_gap
from ident.record import LoopRecord
from ident.record.segments import Floats

MovedBy = Literal["command", "setpoint", "nothing", "unknown"]

LAGS = 8  # of the bank, from a step to the loop's slowest
LONGEST = 8.0  # T + L: the slowest of them
CLEAR = 4.0  # times the share of the command that so many columns explain by chance


@dataclass(frozen=True, slots=True)
class Driven:
    """moved_by: what moved the command on purpose; "command" where the loop is open, "unknown" without a setpoint.

    stds   of log|K|, log|K/T|, the logarithm of the time constants' first, and L (s), from that movement alone, the
           noise as seen; None where nothing moved
    """

    closed: bool
    moved_by: MovedBy
    stds: tuple[float, float, float, float] | None


def driven(base: Ground, found: Found) -> Driven:
    """What was moved on purpose in a record, and how well that tells the plant at a fitted point."""
    if not base.closed:
        return Driven(False, "command", None)
    if base.record.setpoint is None or np.isnan(base.record.setpoint).all():
        return Driven(True, "unknown", None)
    layout = _driven_layout(base.record, found.layout, LONGEST * (found.at.shape.lags + found.at.L))
    if layout is None:
        return Driven(True, "nothing", None)
    return Driven(True, "setpoint", _stds(layout, found))


def _stds(layout: Layout, found: Found) -> tuple[float, float, float, float]:
    at, k = found.at, found.at.log_count
    own = columns(layout, at.shape, at.L)
    slopes = layout.whiten(np.vstack((at.K * own.response, at.K * own.slopes, at.K * own.slope_L, own.nuisance)))
    if found.colour.white or not layout.colour.white:
        covariance = found.colour.variance * inverse_gram(slopes @ slopes.T)
    else:
        covariance = coloured_covariance(slopes, found.colour)
    c = covariance[: k + 2, : k + 2]
    ratio = c[0, 0] + c[1, 1] - 2.0 * c[0, 1]
    K, K_per_T, T, L = (float(np.sqrt(max(v, 0.0))) for v in (c[0, 0], ratio, c[1, 1], c[-1, -1]))
    return K, K_per_T, T, L


def _driven_layout(record: LoopRecord, layout: Layout, slowest: float) -> Layout | None:
    """The layout with the command that setpoint and hand moved in place of the logged one."""
    by_hand = hand_rows(record)
    parts = [slice(s.row0, s.row0 + len(s.given.time)) for s in layout.stretches]
    bank = [_bank(record, part, s.intervals, slowest) for part, s in zip(parts, layout.stretches, strict=True)]
    automatic = np.concatenate([~by_hand[part] for part in parts])
    command = np.concatenate([s.given.command for s in layout.stretches])
    moved = np.zeros_like(command)
    kept = np.ones((1, len(command)))
    if all(b is not None for b in bank):
        rows = np.concatenate([b for b in bank if b is not None], axis=1)
        rows = np.vstack((rows[np.ptp(rows, axis=1) > 0.0], kept))[:, automatic]
        target = command[automatic]
        if len(rows) > 1 and len(target) > 4 * len(rows):
            fitted = solve_normal(rows @ rows.T, rows @ target) @ rows
            deviation = target - target.mean()
            share = float((fitted - fitted.mean()) @ (fitted - fitted.mean())) / max(
                float(deviation @ deviation), 1e-300
            )
            by_chance = len(rows) / len(target)
            if share > CLEAR * by_chance:
                moved[automatic] = fitted - fitted.mean()
    hands = ~automatic
    if hands.any():
        moved[hands] = command[hands] - command[hands].mean()
    if not np.ptp(moved) > 0.0:
        return None
    cut = np.split(moved, np.cumsum([len(s.given.time) for s in layout.stretches])[:-1])
    stretches = tuple(s.commanded(c - c[0]) for s, c in zip(layout.stretches, cut, strict=True))
    replaced = levelled(stretches, layout.command_level, layout.speed_level)
    return replace(replaced, drifting=layout.drifting).whitened(layout.colour)


def _bank(record: LoopRecord, part: slice, steps: float | Floats, slowest: float) -> Floats | None:
    """The setpoint through each lag of the bank, (LAGS + 1, rows); None where it is not known throughout."""
    if record.setpoint is None or np.isnan(record.setpoint[part]).any():
        return None
    r = record.setpoint[part] - record.setpoint[part][0]
    step = float(np.median(steps))
    lags = np.geomspace(step, max(slowest, 2.0 * step), LAGS)
    return np.stack([r, *(lag_gap(r, steps, float(lag)) for lag in lags)])
