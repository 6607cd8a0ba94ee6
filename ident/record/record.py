"""LoopRecord: one log of one speed loop, cleaned, segmented and read-only."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field
from datetime import datetime

import numpy as np
from numpy.typing import ArrayLike

from ident.errors import IdentError
from ident.findings import Finding
from ident.record.segments import Exclusion, Floats, Segment, split


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


@dataclass(frozen=True, eq=False, slots=True)
class LoopRecord:
    """Time, command, speed and, where logged, setpoint of one loop.

    time       (n,), s from the first sample, strictly increasing; any origin is accepted and moved to 0
    command    (n,), controller output u as logged
    speed      (n,), measured speed y as logged
    setpoint   (n,) or None
    excluded   spans left out with their reason; rows with a missing command or speed join them
    segments   runs of usable rows without a gap; estimators give each its own initial condition

    Raises IdentError: length-mismatch, time-not-increasing, too-few-rows, not-finite.
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
    segments: tuple[Segment, ...] = field(default=(), init=False)

    def __post_init__(self) -> None:
        columns = {name: _column(getattr(self, name)) for name in ("time", "command", "speed")}
        if self.setpoint is not None:
            columns["setpoint"] = _column(self.setpoint)
        n = len(columns["time"])
        if any(len(c) != n for c in columns.values()):
            lengths = ", ".join(f"{name} {len(c)}" for name, c in columns.items())
            raise IdentError("length-mismatch", f"All columns need the same number of rows; here: {lengths}.")
        if n < 2:
            raise IdentError("too-few-rows", "A record needs at least two rows.", {"rows": n})
        _check(columns)
        columns["time"] = columns["time"] - columns["time"][0]
        for name, column in columns.items():
            column.flags.writeable = False
            object.__setattr__(self, name, column)
        usable = ~(np.isnan(self.command) | np.isnan(self.speed))
        missing = _spans(~usable, "missing value")
        for span in self.excluded:
            usable[span.start : span.stop] = False
        object.__setattr__(self, "excluded", (*self.excluded, *missing))
        object.__setattr__(self, "segments", split(self.time, usable))

    @property
    def rows(self) -> int:
        return len(self.time)

    @property
    def sample_time(self) -> float | None:
        """The step shared by the uniform segments (median), s; None where no segment is uniform."""
        steps = [s.step for s in self.segments if s.step is not None]
        return float(np.median(steps)) if steps else None


def _column(values: ArrayLike) -> Floats:
    # A copy: the caller's array must not change under a frozen record.
    return np.array(values, dtype=np.float64).reshape(-1)


def _check(columns: dict[str, Floats]) -> None:
    for name, column in columns.items():
        bad = np.isinf(column) if name != "time" else ~np.isfinite(column)
        if bad.any():
            row = int(np.argmax(bad))
            raise IdentError(
                "not-finite",
                f"Row {row} of {name} is {column[row]}: replace it by a number, or leave it empty.",
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


def _spans(mask: np.ndarray[tuple[int], np.dtype[np.bool_]], reason: str) -> Iterable[Exclusion]:
    edges = np.diff(np.concatenate(([0], mask.astype(np.int8), [0])))
    return [
        Exclusion(int(a), int(b), reason)
        for a, b in zip(np.flatnonzero(edges == 1), np.flatnonzero(edges == -1), strict=True)
    ]
