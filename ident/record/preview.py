"""preview: how a log is understood, for a person to confirm before anything is fitted."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from ident.findings import Finding
from ident.record.character import character
from ident.record.columns import Columns
from ident.record.encoding import LogSource
from ident.record.read import read_csv
from ident.record.record import LoopRecord
from ident.record.segments import Floats

SHOWN = 5  # gaps, clock steps and first rows shown; all are counted


@dataclass(frozen=True, slots=True)
class Column:
    """One column as it was understood.

    role, header, why   which column has which role and how it was recognised
    unit                "" where none is named
    lowest, highest     in that unit; None for the time
    quantum             smallest step, in that unit; None where there is none to be seen
    at_low, at_high     share of rows at the lowest and the highest value, in stays of a few rows
    refresh_period_s    time between its changes, where these are regular
    missing             rows without a value in the record
    """

    role: str
    header: str
    why: str
    unit: str
    lowest: float | None = None
    highest: float | None = None
    quantum: float | None = None
    at_low: float | None = None
    at_high: float | None = None
    refresh_period_s: float | None = None
    missing: int = 0


@dataclass(frozen=True, slots=True)
class Gap:
    """A span without rows, from `start_s` on (s from the first row)."""

    start_s: float
    length_s: float


@dataclass(frozen=True, slots=True)
class ClockStep:
    """The clock set back by -`step_s` before the row at `at_s`."""

    at_s: float
    step_s: float


@dataclass(frozen=True, slots=True)
class Mode:
    """A span under one mode of the controller: manual, automatic or cascade."""

    start_s: float
    end_s: float
    mode: str


@dataclass(frozen=True, slots=True)
class Preview:
    """A log as it was understood; every field serialises as it stands.

    rows, rows_used        data rows in the file; rows in segments that estimators see
    dropped                {reason: rows}, with the rows of the record that are left out
    first_stamp, last_stamp as a reader of the log would write them
    start                  RFC 3339, or None where the log has no absolute time
    sample_time_s          of the even segments, or None
    jitter_s               standard deviation of the steps between rows, gaps left out
    first_rows             time in s, setpoint, command, speed of the first rows
    """

    sha256: str
    layout: str
    encoding: str
    delimiter: str
    decimal: str
    rows: int
    rows_used: int
    first_stamp: str
    last_stamp: str
    start: str | None
    duration_s: float
    sample_time_s: float | None
    median_step_s: float
    jitter_s: float
    columns: tuple[Column, ...]
    dropped: dict[str, int]
    gap_count: int
    gaps: tuple[Gap, ...]
    clock_step_count: int
    clock_steps: tuple[ClockStep, ...]
    modes: tuple[Mode, ...]
    first_rows: tuple[tuple[float, float | None, float | None, float | None], ...]
    findings: tuple[Finding, ...]


def preview(
    source: LogSource,
    *,
    columns: Columns | None = None,
    zone: str | None = None,
    date_order: str | None = None,
    start: datetime | str | None = None,
    counts_per_rev: float | None = None,
    blanks: str | None = None,
) -> Preview:
    """Read a log without fitting, and say what was understood. Options and errors are those of `read_csv`."""
    return previewed(
        read_csv(
            source,
            columns=columns,
            zone=zone,
            date_order=date_order,
            start=start,
            counts_per_rev=counts_per_rev,
            blanks=blanks,
        )
    )


def previewed(record: LoopRecord) -> Preview:
    """What was understood of a record that was read from a log."""
    source = record.source
    if source is None or source.understood is None:
        raise TypeError("previewed needs a record that read_csv made")
    how = source.understood
    jumps = record.gaps
    steps = np.delete(np.diff(record.time), jumps - 1)
    shown = sorted(jumps[np.argsort(np.diff(record.time)[jumps - 1])[::-1][:SHOWN]].tolist())
    left_out: dict[str, int] = {}
    for span in record.excluded:
        left_out[span.reason] = left_out.get(span.reason, 0) + span.stop - span.start
    return Preview(
        source.sha256,
        how.layout,
        how.encoding,
        how.delimiter,
        how.decimal,
        source.rows,
        sum(s.rows for s in record.segments),
        how.first,
        how.last,
        record.start.isoformat().replace("+00:00", "Z") if record.start else None,
        record.duration,
        record.sample_time,
        float(np.median(steps)),
        float(np.std(steps)),
        tuple(_column(role, header, how.why, record) for role, header in source.columns.items()),
        {**how.dropped, **left_out},
        len(jumps),
        tuple(Gap(float(record.time[k - 1]), float(record.time[k] - record.time[k - 1])) for k in shown),
        len(how.clock_steps),
        tuple(ClockStep(float(record.time[row]), step) for row, step in how.clock_steps[:SHOWN]),
        tuple(Mode(float(record.time[m.start]), float(record.time[m.stop - 1]), m.mode) for m in record.modes[:SHOWN]),
        _first_rows(record),
        source.findings,
    )


def _column(role: str, header: str, why: Mapping[str, str], record: LoopRecord) -> Column:
    units = {"time": "s", "command": record.command_unit, "speed": record.speed_unit, "setpoint": record.speed_unit}
    values: Floats | None = None if role == "time" else getattr(record, role)
    look = character(values) if values is not None else None
    if look is None or values is None:
        return Column(role, header, why.get(role, ""), units[role])
    even = record.sample_time
    return Column(
        role,
        header,
        why.get(role, ""),
        units[role],
        look.lowest,
        look.highest,
        look.quantum,
        look.at_low,
        look.at_high,
        look.refresh_rows * even if look.refresh_rows and even else None,
        int(np.isnan(values).sum()),
    )


def _first_rows(record: LoopRecord) -> tuple[tuple[float, float | None, float | None, float | None], ...]:
    def cell(values: Floats | None, row: int) -> float | None:
        return None if values is None or np.isnan(values[row]) else float(values[row])

    return tuple(
        (float(record.time[k]), cell(record.setpoint, k), cell(record.command, k), cell(record.speed, k))
        for k in range(min(SHOWN, record.rows))
    )
