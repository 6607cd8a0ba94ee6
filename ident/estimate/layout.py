"""Stretches: what an estimator sees of a record, segment by segment.

Each segment starts from its own initial condition; all share one model and one offset. How a start is
treated decides what may be learnt from its first rows:

settled   the command had been held at its first value long before the log: no transient is freed. Assumed,
          and stated, where the command moves at once and seldom, because a free transient could then not
          be told from the response itself.
free      rows before the first move show the initial state: an exponential transient is freed.
joined    the segment begins in the middle of the action (after a gap, or under a command that always moves):
          the transient is freed and the first L seconds, which answer to a command nobody logged, are left out.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from ident.errors import NotIdentifiable
from ident.estimate import on_change
from ident.evidence.colour import WHITE, Colour
from ident.record import LoopRecord, Segment
from ident.record.segments import Floats

Start = Literal["settled", "free", "joined"]
Places = NDArray[np.intp]

QUIET_ROWS = 5  # rows before the first move that support an initial state of their own
RICH_MOVES = 10  # moves that let a transient be told from the response
SHORTEST = 8  # rows; a shorter segment cannot pay for its own initial condition


@dataclass(frozen=True, slots=True, eq=False)
class Logged:
    """All rows of a segment whose speed is reported on change; time, command and speed (n,) as in a Stretch."""

    time: Floats
    command: Floats
    speed: Floats


@dataclass(frozen=True, slots=True, eq=False)
class Stretch:
    """One segment ready for fitting.

    row0        first row in the record
    time        (n,), s from the segment's first row
    step        s, or None where the rows are not on one grid
    command     (n,), deviation from the record's first usable command
    speed       (n,), deviation from the mean of the usable speeds
    skip        rows at the start left out of the residuals
    straight    the command is taken as straight between samples, not held
    began       s, the segment's first row on the record's clock
    log         all rows of the segment where its rows are the reports of a speed that is reported on change
    direction   (n,), of motion from each row to the next, -1 to 1, where dry friction is fitted
    """

    row0: int
    time: Floats
    step: float | None
    command: Floats
    speed: Floats
    start: Start
    skip: int = 0
    straight: bool = False
    began: float = 0.0
    log: Logged | None = None
    direction: Floats | None = None

    @property
    def rows(self) -> int:
        return len(self.time)

    def until(self, stop: int) -> Stretch:
        """The rows before `stop`."""
        direction = None if self.direction is None else self.direction[:stop]
        return replace(
            self, time=self.time[:stop], command=self.command[:stop], speed=self.speed[:stop], direction=direction
        )

    @property
    def intervals(self) -> float | Floats:
        """The step, or the (n-1,) intervals where there is none."""
        return self.step if self.step is not None else np.diff(self.given.time)

    @property
    def given(self) -> Stretch | Logged:
        """Time and command of the rows that tell the command."""
        return self.log or self

    @property
    def places(self) -> slice | Places:
        """Where the rows stand in the record."""
        if self.log is None:
            return slice(self.row0, self.row0 + self.rows)
        return self.row0 + np.searchsorted(self.log.time, self.time)

    def commanded(self, command: Floats) -> Stretch:
        """The same under another command, one value for each row that tells it."""
        if self.log is None:
            return replace(self, command=command)
        own = command[np.searchsorted(self.log.time, self.time)]
        return replace(self, command=own, log=replace(self.log, command=command))

    @property
    def rates(self) -> Floats:
        """(n,), the command's slope per s from each row to the next; 0 after the last."""
        return np.append(np.diff(self.given.command) / np.diff(self.given.time), 0.0)


@dataclass(frozen=True, slots=True, eq=False)
class Layout:
    """All stretches of a record, with the levels taken off them.

    speed       (rows,), of the rows that enter the residuals, stretch after stretch
    target      the same, whitened by `colour`: what the sum of squares is taken of
    step        s, typical sample time: the median interval;  duration  s, of all stretches together
    drifting    the speed drifts along a straight line that the command does not explain: one more nuisance
    """

    stretches: tuple[Stretch, ...]
    command_level: float
    speed_level: float
    speed: Floats
    step: float
    duration: float
    colour: Colour
    target: Floats
    drifting: bool = False

    @property
    def rows(self) -> int:
        """Rows that enter the residuals."""
        return len(self.speed)

    @property
    def freed(self) -> tuple[int, ...]:
        """Indices of the stretches with a free transient."""
        return tuple(i for i, s in enumerate(self.stretches) if s.start != "settled")

    @property
    def uniform(self) -> bool:
        """Whether every stretch has its rows on one grid."""
        return all(s.step is not None for s in self.stretches)

    @property
    def rubbing(self) -> bool:
        """Whether dry friction is fitted: one more nuisance, the answer to the direction of motion."""
        return self.stretches[0].direction is not None

    @property
    def first_transient(self) -> int:
        """Index of the first transient among the nuisances: after the offset and what else there is."""
        return 1 + self.drifting + self.on_change + self.rubbing

    def straightened(self) -> Layout:
        """The same rows, the command taken as straight between samples."""
        return replace(self, stretches=tuple(replace(s, straight=True) for s in self.stretches))

    @property
    def clock(self) -> Floats:
        """(rows,), s on the record's clock at the used rows."""
        return np.concatenate([s.began + s.time[s.skip :] for s in self.stretches])

    @property
    def on_change(self) -> bool:
        """Whether the speed is reported on change."""
        return any(s.log is not None for s in self.stretches)

    @property
    def ahead(self) -> Floats:
        """(rows,): how far reports on change run ahead of the speed, up to a common factor."""
        return np.concatenate([on_change.ahead(s.time, s.speed)[s.skip :] for s in self.stretches])

    @property
    def deadband(self) -> float:
        """The least change that is reported; 0 where every row is."""
        return on_change.deadband([s.speed for s in self.stretches]) if self.on_change else 0.0

    @property
    def straight(self) -> bool:
        """Whether the command is taken as straight between samples."""
        return any(s.straight for s in self.stretches)

    def leading(self, rows: int) -> tuple[Layout | None, int]:
        """The stretches that make up the first `rows` used rows, not whitened, and how many that came to."""
        kept: list[Stretch] = []
        taken = 0
        for s in self.stretches:
            own = min(s.rows - s.skip, rows - taken)
            if own < SHORTEST:
                break
            stop = s.skip + own
            kept.append(s.until(stop))
            taken += own
        return (self._of(kept), taken) if kept else (None, 0)

    def whitened(self, colour: Colour) -> Layout:
        """The same rows, their residuals to be whitened by a colour."""
        plain = replace(self, colour=colour, target=self.speed)
        return replace(plain, target=plain.whiten(self.speed))

    def whiten(self, rows: Floats) -> Floats:
        """Rows (..., rows) whitened, each stretch by itself."""
        if self.colour.white:
            return rows
        return np.concatenate([self.colour.whiten(part) for part in self.parts(rows)], axis=-1)

    def parts(self, rows: Floats) -> list[Floats]:
        """Rows (..., rows) cut into the stretches."""
        return np.split(rows, np.cumsum([s.rows - s.skip for s in self.stretches])[:-1], axis=-1)

    def skipping(self, dead_time: float) -> Layout:
        """The same stretches, not whitened, each joined one without the rows within `dead_time` of its start."""
        return self._of(
            replace(s, skip=int(np.searchsorted(s.time, dead_time, side="right")) if s.start == "joined" else 0)
            for s in self.stretches
        )

    def evened(self) -> Layout:
        """Every stretch on the typical step: command held, speed interpolated. For start values only."""
        if self.uniform:
            return self
        return self._of(s if s.step is not None else _even(s, self.step) for s in self.stretches)

    def thinned(self, blocks: int) -> Layout:
        """Block means of `blocks` rows of uniform stretches. For start values only."""
        if blocks == 1:
            return self
        return self._of(_thin(s, blocks) for s in self.stretches if s.rows >= 2 * blocks)

    def _of(self, stretches: Iterable[Stretch]) -> Layout:
        return replace(levelled(tuple(stretches), self.command_level, self.speed_level), drifting=self.drifting)


def lay_out(record: LoopRecord) -> Layout:
    """Stretches of a record.

    Raises NotIdentifiable (code too-short) where no segment has SHORTEST rows.
    """
    segments = [s for s in record.segments if s.rows >= SHORTEST]
    if not segments:
        raise NotIdentifiable(
            "too-short",
            f"No run of rows without a gap is longer than {SHORTEST} rows: log faster, or longer without gaps.",
            {"longest_rows": max((s.rows for s in record.segments), default=0)},
        )
    command_level = float(record.command[segments[0].start])
    speed_level = float(np.concatenate([record.speed[s.slice] for s in segments]).mean())
    stretches = tuple(
        _stretch(record, segment, first=i == 0, levels=(command_level, speed_level))
        for i, segment in enumerate(segments)
    )
    return levelled(stretches, command_level, speed_level)


def _stretch(record: LoopRecord, segment: Segment, *, first: bool, levels: tuple[float, float]) -> Stretch:
    command = record.command[segment.slice] - levels[0]
    moves = np.flatnonzero(np.diff(command))
    quiet = int(moves[0]) + 1 if len(moves) else segment.rows
    start: Start = "joined"
    if first and quiet >= QUIET_ROWS:
        start = "free"
    elif first and len(moves) < RICH_MOVES:
        start = "settled"
    began = float(record.time[segment.start])
    time = record.time[segment.slice] - began
    if segment.step is not None:
        # Stamps are rounded by the logger; the clock behind them is not.
        time = np.asarray(segment.step * np.arange(segment.rows), dtype=np.float64)
    speed = record.speed[segment.slice] - levels[1]
    if record.held is not None:
        told = ~record.held[segment.slice]
        whole = Logged(time, command, speed)
        return Stretch(segment.start, time[told], None, command[told], speed[told], "joined", began=began, log=whole)
    return Stretch(segment.start, time, segment.step, command, speed, start, began=began)


def _even(stretch: Stretch, step: float) -> Stretch:
    time = np.arange(0.0, stretch.time[-1] + 0.5 * step, step)
    given = stretch.given
    held = np.searchsorted(given.time, time, side="right") - 1
    speed = np.interp(time, given.time, given.speed)
    skip = int(np.searchsorted(time, stretch.time[min(stretch.skip, stretch.rows - 1)]))
    direction = None if stretch.direction is None else stretch.direction[held]
    return replace(
        stretch,
        time=time,
        step=step,
        command=given.command[held],
        speed=speed,
        skip=skip,
        log=None,
        direction=direction,
    )


def _thin(stretch: Stretch, blocks: int) -> Stretch:
    rows = stretch.rows // blocks * blocks

    def mean(series: Floats) -> Floats:
        return np.asarray(series[:rows].reshape(-1, blocks).mean(axis=1))

    speed = mean(stretch.speed)
    step = (stretch.step or 0.0) * blocks
    return replace(
        stretch,
        time=np.asarray(step * np.arange(len(speed)), dtype=np.float64),
        step=step,
        command=mean(stretch.command),
        speed=speed,
        direction=None if stretch.direction is None else mean(stretch.direction),
        skip=min(-(-stretch.skip // blocks), len(speed) - 1),
    )


def levelled(stretches: tuple[Stretch, ...], command_level: float, speed_level: float) -> Layout:
    used = tuple(s for s in stretches if s.skip < s.rows)
    if not used:
        raise NotIdentifiable("too-short", "Every run of rows is shorter than the dead time: log longer.", {})
    speed = used[0].speed[used[0].skip :]
    if len(used) > 1:
        speed = np.concatenate([s.speed[s.skip :] for s in used])
    if all(s.step is not None for s in used):
        # Rows weigh the steps, as they would in the median of all intervals.
        steps = np.repeat([s.step or 0.0 for s in used], [s.rows for s in used]) if len(used) > 1 else used[0].step
    else:
        steps = np.concatenate([np.diff(s.time) for s in used])
    return Layout(
        used,
        command_level,
        speed_level,
        speed,
        float(np.median(steps)) if steps is not None else 0.0,
        float(sum(s.time[-1] for s in used)),
        WHITE,
        speed,
    )
