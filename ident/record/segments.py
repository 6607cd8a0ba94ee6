"""Segments: the runs of rows between gaps, each on its own time axis."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Lines = NDArray[np.int64]

# A step longer than this many typical steps is a gap. One row lost from a steady clock makes a step of 1.8
# typical steps or more (20 among 10 and 11 ms); logs written on change space their rows freely and need
# the second.
STEADY_GAP = 1.75
IRREGULAR_GAP = 10.0
# A clock is steady when all steps but a few lie this close to the typical one (stamps of 3, 3, 4 ms do).
STEADY_SPREAD = 0.35
ODD_SHARE = 0.1
# Steps of the usual size that one report on change may make after a silence before something must have been missed.
MISSED = 5.0
# Stamps rounded to a few percent of the step still describe one grid.
UNIFORM_TOLERANCE = 0.1
# The sample time is given to this many digits: stamps carry no more, and the rounding of sums stays out.
STEP_DIGITS = 12


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
    # A least-squares line, because the end stamps are rounded like all others. A plain sum and no dot product,
    # whose last digit would depend on the number of BLAS threads.
    k = np.arange(n) - (n - 1) / 2
    step = float(np.sum(k * time)) / (n * (n * n - 1) / 12)
    off_grid = time - step * k
    spread = float(off_grid.max() - off_grid.min()) / 2
    return float(f"{step:.{STEP_DIGITS}g}") if spread <= UNIFORM_TOLERANCE * step else None


def steady_step(steps: Floats) -> tuple[float, bool]:
    """The typical step and whether all steps but a few lie close to it; 0 where there is none.

    steps   (n,), s, positive
    """
    if len(steps) == 0:
        return 0.0, True
    typical = float(np.median(steps))
    odd = np.count_nonzero(np.abs(steps - typical) > STEADY_SPREAD * typical)
    return typical, bool(odd <= max(2, ODD_SHARE * len(steps)))


def gaps(time: Floats) -> NDArray[np.intp]:
    """Rows before which the clock jumps: the step to them is a gap.

    time    (n,), s, strictly increasing
    """
    steps = np.diff(time)
    if len(steps) == 0:
        return np.zeros(0, dtype=np.intp)
    typical, steady = steady_step(steps)
    limit = (STEADY_GAP if steady else IRREGULAR_GAP) * typical
    # Stamps are rounded: a step of exactly the limit must not become a gap by its last digit.
    return np.flatnonzero(steps > limit * (1 + 1e-9)) + 1


def spans(flags: Flags) -> NDArray[np.intp]:
    """Runs of True as rows of (start, stop).

    flags   (n,)
    """
    edges = np.flatnonzero(np.diff(flags.astype(np.int8), prepend=0, append=0))
    return edges.reshape(-1, 2)


def outages(time: Floats, speed: Floats, held: Flags) -> NDArray[np.intp]:
    """The same of a log that reports on change, where silence says that the speed stands still.

    An outage shows where the speed is plainly another one after a silence than before.

    speed   (n,);  held  (n,), rows without a report of the speed
    """
    told = np.flatnonzero(~held & np.isfinite(speed))
    moves = np.abs(np.diff(speed[told]))
    silent = gaps(time[told]) if len(told) else told
    return np.asarray(told[silent[moves[silent - 1] > MISSED * np.median(moves)]] if len(silent) else silent)


def runs(usable: Flags, breaks: tuple[int, ...] = ()) -> NDArray[np.intp]:
    """Runs of usable rows, as rows of (start, stop); single rows included.

    usable  (n,), False where a row is left out
    breaks  rows before which a run ends: gaps, clocks that were set
    """
    first = usable.copy()
    first[1:] &= ~usable[:-1]
    jumps = np.array(breaks, dtype=np.intp)
    first[jumps] = usable[jumps]
    starts = np.flatnonzero(first)
    # A run ends where rows stop being usable or where the next one starts.
    ends = usable.copy()
    ends[:-1] &= ~usable[1:] | first[1:]
    return np.column_stack((starts, np.flatnonzero(ends) + 1))
