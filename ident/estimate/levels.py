"""Levels: a gain that varies with the size of the command, told by a sum of gains over bands of it.

A drive or a motor whose gain falls with level pushes less than a linear one at large commands: the direction of motion,
taken as an input, then *helps* the motion. That is no friction. Each band of the command's size, passed through the
plant of the linear fit by itself, gets a gain of its own.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from ident.estimate.columns import columns
from ident.estimate.layout import Layout
from ident.estimate.point import Point, solve
from ident.evidence.colour import coloured_covariance, noise_colour
from ident.findings import Finding

CLEAR = 4.0  # standard deviations between the gains of the smallest and the largest commands
NOTABLE = 0.15  # of the smaller gain: less changes no setting
BANDS = (1 / 3, 2 / 3)  # quantiles of the command's size between them


@dataclass(frozen=True, slots=True)
class Band:
    """Change of speed per change of command while the command's size lies between two values, command units."""

    above: float
    below: float
    gain: float
    std: float


def levels(layout: Layout, at: Point) -> tuple[Band, ...]:
    """The gain in each band of the command's size, T and L those of the linear fit; nothing where it has one size."""
    absolute = [s.command + layout.command_level for s in layout.stretches]
    sizes = np.abs(np.concatenate(absolute))
    edges = np.unique(np.concatenate(([0.0], np.quantile(sizes, BANDS), [float(sizes.max())])))
    if len(edges) < 3:
        return ()
    answers = []
    for low, high in pairwise(edges):
        inside = [np.clip(u, -high, high) - np.clip(u, -low, low) for u in absolute]
        parts = [
            at.shape.answer(replace(s, command=u - u[0]), at.L)[0]
            for s, u in zip(layout.stretches, inside, strict=True)
        ]
        starts = [np.full(len(p), u[0] - inside[0][0]) for p, u in zip(parts, inside, strict=True)]
        answers.append(np.concatenate(parts) + np.concatenate(starts))
    rows = np.vstack((answers, columns(layout, at.shape, at.L).nuisance))
    found = solve(rows, layout.speed)
    left = layout.speed - found @ rows
    stds = np.sqrt(np.maximum(np.diag(coloured_covariance(rows, noise_colour(layout.parts(left)))), 0.0))
    return tuple(
        Band(float(low), float(high), float(gain), float(std))
        for low, high, gain, std in zip(edges[:-1], edges[1:], found, stds, strict=False)
    )


def level_varies(layout: Layout, at: Point, unit: str) -> tuple[Finding, ...]:
    """The gains of the bands as a finding, where they differ."""
    bands = levels(layout, at)
    if len(bands) < 2:
        return ()
    small, large = bands[0], bands[-1]
    apart = abs(small.gain - large.gain)
    if apart < CLEAR * math.hypot(small.std, large.std) or apart < NOTABLE * min(abs(small.gain), abs(large.gain)):
        return ()
    said = ", ".join(f"{b.gain:.3g} from {b.above:.3g} to {b.below:.3g}" for b in bands)
    return (
        Finding(
            "gain-varies-with-level",
            "warning",
            f"The gain varies with the size of the command ({unit or 'command units'}): {said}. K and T are a linear "
            "compromise. Tune for the largest gain at which the loop is to run; no dry friction is claimed.",
            {
                key: value
                for i, b in enumerate(bands, start=1)
                for key, value in ((f"below_{i}", b.below), (f"gain_{i}", b.gain), (f"gain_{i}_std", b.std))
            },
        ),
    )
