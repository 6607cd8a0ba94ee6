"""Segments: the runs of rows between gaps, each on its own time axis."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

# A step longer than this many typical steps is a gap. Rounded or jittered stamps stay well below the first;
# logs written on change space their rows freely and need the second.
UNIFORM_GAP = 1.5
IRREGULAR_GAP = 10.0
# Stamps rounded to a few percent of the step still describe a uniform clock.
UNIFORM_TOLERANCE = 0.1


@dataclass(frozen=True, slots=True)
class Segment:
    """Rows start..stop-1 of a record, without a gap.

    step    sample time in s where the stamps lie on one grid, else None
    """

    start: int
    stop: int
    step: float | None

    @property
    def rows(self) -> int:
        return self.stop - self.start

    @property
    def slice(self) -> slice:
        return slice(self.start, self.stop)


@dataclass(frozen=True, slots=True)
class Exclusion:
    """Rows start..stop-1 left out of every fit, and why."""

    start: int
    stop: int
    reason: str


def uniform_step(time: Floats) -> float | None:
    """The sample time of stamps that lie on one grid within UNIFORM_TOLERANCE of a step, else None.

    time    (n,), s, increasing; fewer than two rows have no step
    """
    n = len(time)
    if n < 2:
        return None
    step = float(time[-1] - time[0]) / (n - 1)
    off_grid = np.abs(time - (time[0] + step * np.arange(n)))
    # The ends are on the grid by construction; a slow wander still shows in the middle.
    return step if float(off_grid.max()) <= UNIFORM_TOLERANCE * step else None


def split(time: Floats, usable: NDArray[np.bool_]) -> tuple[Segment, ...]:
    """Cut a record where the clock jumps and where rows are unusable.

    time    (n,), s, strictly increasing over usable rows
    usable  (n,), False where a row is left out
    """
    rows = np.flatnonzero(usable)
    if len(rows) == 0:
        return ()
    if len(rows) == 1:
        return (Segment(int(rows[0]), int(rows[0]) + 1, None),)
    steps = np.diff(time[rows])
    typical = float(np.median(steps))
    regular = float(np.mean(np.abs(steps - typical) <= UNIFORM_TOLERANCE * typical)) >= 0.9
    limit = (UNIFORM_GAP if regular else IRREGULAR_GAP) * typical
    cuts = np.flatnonzero((steps > limit) | (np.diff(rows) > 1)) + 1
    bounds = np.concatenate(([0], cuts, [len(rows)]))
    return tuple(
        Segment(int(rows[a]), int(rows[b - 1]) + 1, uniform_step(time[rows[a:b]]))
        for a, b in zip(bounds[:-1], bounds[1:], strict=True)
    )
