"""Stamps to seconds from the first row: elapsed, epoch, spreadsheet days, written dates, with or without a zone.

Differences are taken between integers or rounded to what a float stamp can carry, so that 0.1 s stays 0.1 s.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import pandas as pd

from ident.errors import ReadError
from ident.record.quote import printable, quoted
from ident.record.segments import Floats, Lines
from ident.record.written import NS, Bytes, Ints, read_written

# Epoch stamps between 1990 and 2100 in these units; smaller numbers are elapsed time.
_EPOCH = ((1.0, 6), (1e-3, 6), (1e-6, 6), (1e-9, 9))
_FIRST, _LAST = 6.3e8, 4.11e9
_ISO = r"\d{4}-\d{1,2}-\d{1,2}[T ]\d{1,2}:\d{2}(?::\d{2}(?:\.\d+)?)?(?: ?Z| ?[+-]\d{2}:?\d{2})?"
# Spreadsheets count days from here, so that 1900-03-01 is 61.
_DAY_ZERO = datetime(1899, 12, 30, tzinfo=UTC)
_DAYS = (20000, 80000)
_DAY_STEP = 1e-3  # days; longer steps are elapsed seconds
DAY = 86400


@dataclass(frozen=True, slots=True, eq=False)
class Stamps:
    """A time axis.

    time        (n,), s from the first row
    start       UTC, or None
    kind        elapsed, epoch, absolute (with offset or zone), local (no zone), clock (no date)
    origin      the first stamp: s since 1970, or as written
    two_digits  years were written with two digits
    """

    time: Floats
    start: datetime | None
    kind: str
    origin: float
    two_digits: bool = False

    def told(self, time: float) -> str:
        """A time on this axis, s from the first row, as a reader of the log would write it."""
        if self.kind == "elapsed":
            return f"{self.origin + time:.9g} s"
        # Whole microseconds since 1970 are exact in a float; written times of day are of 1970-01-01.
        stamp = datetime(1970, 1, 1) + timedelta(seconds=self.origin) + timedelta(seconds=float(time))
        text = stamp.isoformat(timespec="milliseconds")
        return text[11:] if self.kind == "clock" else text + "Z" * (self.kind in {"epoch", "absolute"})


def from_numbers(values: Floats | Lines, *, scale: float | None, zone: ZoneInfo | None, name: str, line: int) -> Stamps:
    """Elapsed seconds, spreadsheet days, or epoch seconds to nanoseconds told apart by their size.

    values    (n,), finite; whole numbers as integers, because nanoseconds since 1970 need all 64 bits
    scale     s per unit where the header names one, else None

    Raises ReadError: unreadable-time, ambiguous-times.
    """
    size = float(np.abs(values).max())
    if size < _FIRST and not (scale and scale < 1):
        if scale is None and _DAYS[0] <= values.min() and size <= _DAYS[1]:
            steps = np.abs(np.diff(values))
            if 0 < np.median(steps) < _DAY_STEP:
                return _from_days(values.astype(np.float64), zone, name, line)
        return Stamps(_shifted(values) * (scale or 1.0), None, "elapsed", float(values[0]) * (scale or 1.0))
    for unit, digits in _EPOCH:
        if values.min() * unit >= _FIRST and size * unit <= _LAST and scale in (None, unit):
            elapsed = np.round(_shifted(values) * unit, digits)
            start = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(seconds=float(np.floor(values[0] * unit)))
            part = timedelta(microseconds=round((values[0] * unit - np.floor(values[0] * unit)) * 1e6))
            return Stamps(elapsed, start + part, "epoch", (start + part).timestamp())
    if scale and size * scale < _FIRST:
        return Stamps(np.round(_shifted(values) * scale, 12), None, "elapsed", float(values[0]) * scale)
    raise ReadError(
        "unreadable-time",
        f"Line {line}, column {quoted(name)}: {values[0]:.17g} is neither elapsed seconds nor an "
        "epoch stamp between 1990 and 2100; export stamps as ISO 8601 or seconds.",
        {"line": line},
    )


def _from_days(days: Floats, zone: ZoneInfo | None, name: str, line: int) -> Stamps:
    # Eight decimals of a day are 0.86 ms: whole milliseconds undo that rounding, and say no more than was kept.
    ticks = np.round(days * DAY * 1000).astype(np.int64) * 1000
    ticks += round((_DAY_ZERO - datetime(1970, 1, 1, tzinfo=UTC)).total_seconds()) * 1_000_000
    return _located(ticks, NS // 1000, "local", zone, np.full(len(ticks), line), name)


def _shifted(values: Floats | Lines) -> Floats:
    shifted: Floats = (values - values[0]).astype(np.float64)
    return shifted


def is_iso(cell: str) -> bool:
    """Whether a cell is an ISO 8601 stamp."""
    return bool(re.fullmatch(_ISO, cell.strip()))


def from_text(
    cells: pd.Series | Bytes, line: Lines, *, name: str, zone: ZoneInfo | None, date_order: str | None
) -> Stamps:
    """Written stamps.

    cells    text, or stamps where all were found to be ISO 8601; none blank
    line     (n,) file lines

    Raises ReadError: unreadable-time, ambiguous-dates, ambiguous-times.
    """
    if isinstance(cells, pd.Series):
        aware = cells.dt.tz is not None
        naive = cells.dt.tz_convert("UTC").dt.tz_localize(None) if aware else cells
        unit = "ns" if getattr(naive.dt, "unit", "ns") == "ns" else "us"
        ticks = naive.dt.as_unit(unit).to_numpy().astype(np.int64)
        return _located(ticks, NS if unit == "ns" else NS // 1000, "absolute" if aware else "local", zone, line, name)
    read = read_written(cells, line, name=name, date_order=date_order)
    if read.kind == "clock":
        # Past midnight the clock starts anew.
        days = np.cumsum(np.diff(read.ticks, prepend=read.ticks[0]) < -DAY // 2 * read.per_second)
        return _located(read.ticks + days * DAY * read.per_second, read.per_second, "clock", None, line, name)
    return _located(read.ticks, read.per_second, read.kind, zone, line, name, two_digits=read.two_digits)


def _located(
    ticks: Ints,
    per_second: int,
    kind: str,
    zone: ZoneInfo | None,
    line: Lines,
    name: str,
    *,
    two_digits: bool = False,
) -> Stamps:
    """From ticks (UTC, or local) to seconds and a start."""
    if kind == "local" and zone is not None:
        ticks, kind = _in_zone(ticks, per_second, zone, line, name), "absolute"
    first = int(ticks[0])
    if kind != "clock" and not 0 <= first / per_second <= _LAST:
        shown = np.datetime64(first, "us" if per_second < NS else "ns")
        raise ReadError(
            "unreadable-time",
            f"Line {line[0]}, column {quoted(name)}: {quoted(str(shown))} is not between 1970 and 2100; check how "
            "the dates are written.",
            {"line": int(line[0]), "column": printable(name)},
        )
    start = None
    if kind == "absolute":
        start = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(microseconds=first // (per_second // 1_000_000))
    return Stamps((ticks - first) / per_second, start, kind, first / per_second, two_digits)


def _in_zone(ticks: Ints, per_second: int, zone: ZoneInfo, line: Lines, name: str) -> Ints:
    """Local ticks to UTC; the repeated hour of autumn is told apart by the order of the rows."""
    stamps = pd.Series(ticks.view("M8[ns]" if per_second == NS else "M8[us]"))
    twice = stamps.dt.tz_localize(zone, ambiguous="NaT", nonexistent="NaT")
    lost = twice.isna().to_numpy()
    if lost.any():
        try:
            twice = stamps.dt.tz_localize(zone, ambiguous="infer")
        except ValueError as cause:
            row = int(np.argmax(lost))
            raise ReadError(
                "ambiguous-times",
                f"Line {line[row]}, column {quoted(name)}: {quoted(str(stamps.iloc[row]))} occurs twice "
                f"or never in {printable(str(zone))} (clock change), and the order of the rows does not tell; "
                "export stamps with offset.",
                {"line": int(line[row]), "count": int(lost.sum())},
            ) from cause
    there: Ints = twice.dt.tz_convert(None).to_numpy().astype(np.int64)
    return there
