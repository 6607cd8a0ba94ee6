"""LoopRecord: one log of one speed loop, cleaned, segmented and read-only."""

from __future__ import annotations

from dataclasses import dataclass, field, fields
from datetime import UTC, datetime, timedelta

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ident.errors import IdentError
from ident.findings import Finding
from ident.record.segments import Exclusion, Flags, Floats, Segment, gaps, outages, runs, spans, uniform_step

MISSING = "missing value"
LONE = "single row between gaps"


@dataclass(frozen=True, slots=True)
class Understood:
    """How a log was read, for a person to confirm.

    layout          wide, long or paired
    why             {role: how its column was recognised}
    first, last     stamps as a reader of the log would write them
    dropped         {reason: rows}
    clock_steps     (row of the record, s by which the clock was set back) of each
    """

    layout: str
    encoding: str
    delimiter: str
    decimal: str
    why: dict[str, str]
    first: str
    last: str
    dropped: dict[str, int]
    clock_steps: tuple[tuple[int, float], ...] = ()


@dataclass(frozen=True, slots=True)
class Source:
    """Where a record came from: what the report shows of the log itself.

    sha256    of the bytes read
    rows      data rows in the file, before any was left out
    columns   {role: header}, roles time, setpoint, command, speed
    """

    sha256: str
    rows: int
    columns: dict[str, str] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()
    understood: Understood | None = None


@dataclass(frozen=True, slots=True)
class ModeSpan:
    """Rows start..stop-1 under one mode of the controller.

    mode    manual, automatic or cascade
    """

    start: int
    stop: int
    mode: str


@dataclass(frozen=True, eq=False, slots=True)
class LoopRecord:
    """Time, command, speed and, where logged, setpoint of one loop.

    time       (n,), s from the first sample, strictly increasing; any origin is accepted and moved to 0
    command    (n,), controller output u as logged; NaN where missing
    speed      (n,), measured speed y as logged; NaN where missing
    setpoint   (n,) or None; NaN where missing
    start      time of the first row, aware (kept in UTC), or None
    excluded   spans left out with their reason; rows with a missing command or speed join them, and so do
               single rows between gaps, which cannot carry an initial condition
    breaks     rows before which the clock was set: no segment crosses them
    held       (n,) of a log that reports on change: rows whose speed is its last report; else None
    modes      spans by the controller's mode, where logged; in manual the setpoint does not command anything
    segments   runs of two or more usable rows without a gap; estimators give each its own initial condition

    Raises IdentError: length-mismatch, time-not-increasing, too-few-rows, not-finite, naive-start,
    exclusion-out-of-range.
    """

    time: Floats
    command: Floats
    speed: Floats
    setpoint: Floats | None = None
    speed_unit: str = field(default="", kw_only=True)
    command_unit: str = field(default="", kw_only=True)
    start: datetime | None = field(default=None, kw_only=True)
    source: Source | None = field(default=None, kw_only=True)
    excluded: tuple[Exclusion, ...] = field(default=(), kw_only=True)
    breaks: tuple[int, ...] = field(default=(), kw_only=True)
    modes: tuple[ModeSpan, ...] = field(default=(), kw_only=True)
    held: Flags | None = field(default=None, kw_only=True)
    segments: tuple[Segment, ...] = field(default=(), init=False)

    def __post_init__(self) -> None:
        columns = {name: _column(getattr(self, name)) for name in ("time", "command", "speed")}
        if self.setpoint is not None:
            columns["setpoint"] = _column(self.setpoint)
        _check(columns, self.held)
        columns["time"] = columns["time"] - columns["time"][0]
        if self.held is not None:
            held = np.array(self.held, dtype=np.bool_).reshape(-1)
            held.flags.writeable = False
            object.__setattr__(self, "held", held)
        for name, column in columns.items():
            column.flags.writeable = False
            object.__setattr__(self, name, column)
        if self.start is not None:
            object.__setattr__(self, "start", _utc(self.start))
        self._segment()

    def _segment(self) -> None:
        """Find the spans left out and the segments between them; the same again for the result of it."""
        usable = np.ones(self.rows, dtype=np.bool_)
        for span in self.excluded:
            if not 0 <= span.start < span.stop <= self.rows:
                raise IdentError(
                    "exclusion-out-of-range",
                    f"An excluded span needs 0 <= start < stop <= {self.rows}; here {span.start} to {span.stop}.",
                )
            usable[span.start : span.stop] = False
        missing = usable & (np.isnan(self.command) | np.isnan(self.speed))
        usable &= ~missing
        found = runs(usable, (*self.gaps.tolist(), *self.breaks))
        single = found[:, 1] - found[:, 0] < 2
        lone = np.zeros(self.rows, dtype=np.bool_)
        lone[found[single, 0]] = True
        excluded = (*self.excluded, *exclusions(missing, MISSING), *exclusions(lone, LONE))
        object.__setattr__(self, "excluded", excluded)
        object.__setattr__(
            self,
            "segments",
            tuple(Segment(a, b, uniform_step(self.time[a:b])) for a, b in found[~single].tolist()),
        )

    @property
    def rows(self) -> int:
        return len(self.time)

    @property
    def gaps(self) -> NDArray[np.intp]:
        """Rows before which the log is silent although it should not be."""
        return gaps(self.time) if self.held is None else outages(self.time, self.speed, self.held)

    @property
    def duration(self) -> float:
        """From the first row to the last, s."""
        return float(self.time[-1])

    @property
    def end(self) -> datetime | None:
        """Time of the last row, UTC; None where the log has no absolute time."""
        return None if self.start is None else self.start + timedelta(seconds=self.duration)

    @property
    def sample_time(self) -> float | None:
        """The step of the uniform segments, s (the median over their rows); None where none is uniform."""
        uniform = sorted((s.step, s.rows) for s in self.segments if s.step is not None)
        if not uniform:
            return None
        rows = np.cumsum([n for _, n in uniform])
        return uniform[int(np.searchsorted(rows, rows[-1] / 2))][0]

    def __reduce__(self) -> tuple[object, ...]:
        # Through the constructor, because a pickled array comes back writeable.
        return _rebuild, ({f.name: getattr(self, f.name) for f in fields(self) if f.init},)


def _rebuild(values: dict[str, object]) -> LoopRecord:
    return LoopRecord(**values)  # type: ignore[arg-type]


def _column(values: ArrayLike) -> Floats:
    # A copy: the caller's array must not change under a frozen record.
    return np.array(values, dtype=np.float64).reshape(-1)


def _utc(start: datetime) -> datetime:
    if start.utcoffset() is None:
        raise IdentError("naive-start", "The start of a record needs a time zone; give an aware datetime.")
    return start.astimezone(UTC)


def _check(columns: dict[str, Floats], held: Flags | None) -> None:
    sizes = {name: len(c) for name, c in columns.items()} | ({} if held is None else {"held": np.size(held)})
    n = sizes["time"]
    if any(size != n for size in sizes.values()):
        lengths = ", ".join(f"{name} {size}" for name, size in sizes.items())
        raise IdentError("length-mismatch", f"All columns need the same number of rows; here: {lengths}.")
    if n < 2:
        raise IdentError("too-few-rows", "A record needs at least two rows.", {"rows": n})
    for name, column in columns.items():
        bad = np.isinf(column) if name != "time" else ~np.isfinite(column)
        if bad.any():
            row = int(np.argmax(bad))
            allowed = "replace it by a number" if name == "time" else "replace it by a number, or by NaN"
            raise IdentError(
                "not-finite",
                f"Row {row} of {name} is {column[row]}: {allowed}.",
                {"row": row, "column": name},
            )
    back = np.flatnonzero(np.diff(columns["time"]) <= 0)
    if len(back):
        row = int(back[0]) + 1
        raise IdentError(
            "time-not-increasing",
            f"Time stands still or runs backwards at row {row}; sort the rows or split the record there.",
            {"row": row, "count": len(back)},
        )


def exclusions(flags: Flags, reason: str) -> tuple[Exclusion, ...]:
    """The flagged rows as spans with one reason."""
    return tuple(Exclusion(a, b, reason) for a, b in spans(flags).tolist())
