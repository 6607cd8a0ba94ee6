"""Shape: what a plant's answer looks like apart from gain and dead time, and how a dead time delays it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np

from ident.estimate.layout import Layout, Stretch
from ident.record.segments import Floats


class Shape(Protocol):
    """A stable, unit-gain answer with k time constants, in logarithms where it is moved."""

    @property
    def lags(self) -> float:
        """Sum of the time constants, s."""

    @property
    def slowest(self) -> float:
        """No free motion has a longer time constant, s."""

    def reach(self, layout: Layout) -> tuple[Floats, Floats]:
        """The least and most (k,) that one step may take of the logarithms, within what the layout can tell."""

    def moved(self, log_steps: Floats, layout: Layout) -> Shape:
        """The shape after a step (k,) of the logarithms, within what the layout can tell."""

    def answer(self, stretch: Stretch, L: float) -> tuple[Floats, Floats, Floats]:
        """At the used rows: answer (n,), slopes in the logarithms (k, n), slope in L (n,)."""

    def transients(self, time: Floats) -> tuple[Floats, Floats]:
        """Free motions from t = 0 (m, n), and their slopes in the logarithms (k, m, n)."""

    def step(self, time: Floats) -> Floats:
        """The answer to a unit step, `time` s after it."""

    def impulse(self, time: Floats) -> Floats:
        """The answer to a unit impulse, `time` s after it, per s."""


@dataclass(frozen=True, slots=True, eq=False)
class Delayed:
    """Series of a stretch at the sample held when the delayed command was given.

    series   each (n,) over the used rows
    since    s from that sample to the instant asked for: one number on a uniform grid, else (n,)
    """

    series: tuple[Floats, ...]
    since: float | Floats


def delayed(stretch: Stretch, L: float, series: tuple[Floats, ...]) -> Delayed:
    """The command (first of the series) and states, L s back from every used row.

    Before the stretch the command is held at its first value and the states are zero. Where L is a whole number of
    samples the instant lies at the end of the interval below, so slopes in L are those above the kink.
    """
    skip, n = stretch.skip, stretch.rows
    fills = (float(series[0][0]), *(0.0 for _ in series[1:]))
    if stretch.step is not None:
        whole = int(L / stretch.step)
        shift = whole + 1
        before = min(max(shift - skip, 0), n - skip)
        held = slice(max(skip - shift, 0), n - shift if n > shift else 0)
        parts = tuple(
            np.concatenate((np.full(before, fill), values[held])) if before else values[held]
            for values, fill in zip(series, fills, strict=True)
        )
        return Delayed(parts, shift * stretch.step - L)
    instant = stretch.time[skip:] - L
    index = np.searchsorted(stretch.given.time, instant, side="right") - 1
    early = index < 0
    index[early] = 0
    since = instant - stretch.given.time[index]
    since[early] = 0.0
    # At row 0 the states are zero (settled), so early instants take it as it is.
    return Delayed(tuple(values[index] for values in series), since)
