"""Stamps to seconds from the first row: elapsed, epoch, ISO 8601, day-first or month-first dates.

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

Texts = pd.Series  # of str

DATE_ORDERS = ("dmy", "mdy", "ymd")

# Epoch stamps between 1990 and 2100 in these units; smaller numbers are elapsed time.
_EPOCH = ((1.0, 6), (1e-3, 6), (1e-6, 6), (1e-9, 9))
_FIRST, _LAST = 6.3e8, 4.11e9
_ISO = r"\d{4}[-/]\d{1,2}[-/]\d{1,2}(?:[T ]+\d{1,2}:\d{2}(?::\d{2}(?:\.\d+)?)?)?(?: ?Z| ?[+-]\d{2}:?\d{2})?"
_OFFSET = r":\d{2}(?:\.\d+)? ?(?:Z|[+-]\d{2}:?\d{2})$"
_DAY_FIRST = r"^(\d{1,2})[./-](\d{1,2})[./-](\d{4})"
_DMY, _MDY = r"\3-\2-\1", r"\3-\1-\2"
_CLOCK = r"^\d{1,2}:\d{2}(?::\d{2}(?:[.,]\d+)?)?"
_AM_PM = r"(?i)[AP]\.?M\.?$"


@dataclass(frozen=True, slots=True)
class Stamps:
    """A time axis.

    time     (n,), s from the first row
    start    UTC, or None
    kind     elapsed, epoch, absolute (with offset or zone), local (no zone), clock (no date)
    """

    time: Floats
    start: datetime | None
    kind: str


def from_numbers(values: Floats | Lines, *, scale: float | None, name: str, line: int) -> Stamps:
    """Elapsed seconds, or epoch seconds to nanoseconds told apart by their size.

    values    (n,), finite; whole numbers as integers, because nanoseconds since 1970 need all 64 bits
    scale     s per unit where the header names one, else None

    Raises ReadError: unreadable-time.
    """
    size = float(np.abs(values).max())
    if size < _FIRST and not (scale and scale < 1):
        if scale is None and 20000 <= values[0] <= 80000 and 0 < np.median(np.diff(values)) < 1e-4:
            raise ReadError(
                "unreadable-time",
                f"Column {quoted(name)} looks like spreadsheet days ({values[0]:.6f}): export "
                "stamps as ISO 8601, or "
                'name the unit in the header, as in "time [s]".',
                {"line": line},
            )
        return Stamps(_shifted(values) * (scale or 1.0), None, "elapsed")
    for unit, digits in _EPOCH:
        if values.min() * unit >= _FIRST and size * unit <= _LAST and scale in (None, unit):
            elapsed = np.round(_shifted(values) * unit, digits)
            start = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(seconds=float(np.floor(values[0] * unit)))
            part = timedelta(microseconds=round((values[0] * unit - np.floor(values[0] * unit)) * 1e6))
            return Stamps(elapsed, start + part, "epoch")
    if scale and size * scale < _FIRST:
        return Stamps(np.round(_shifted(values) * scale, 12), None, "elapsed")
    raise ReadError(
        "unreadable-time",
        f"Line {line}, column {quoted(name)}: {values[0]:.17g} is neither elapsed seconds nor an "
        "epoch stamp between 1990 and 2100; export stamps as ISO 8601 or seconds.",
        {"line": line},
    )


def _shifted(values: Floats | Lines) -> Floats:
    shifted: Floats = (values - values[0]).astype(np.float64)
    return shifted


def is_iso(cell: str) -> bool:
    """Whether a cell is an ISO 8601 stamp."""
    return bool(re.fullmatch(_ISO, cell.strip()))


def from_text(
    cells: Texts,
    line: Lines,
    *,
    name: str,
    zone: ZoneInfo | None,
    date_order: str | None,
) -> Stamps:
    """Stamps written as dates: ISO 8601, dd.mm.yyyy, d/m/yyyy or m/d/yyyy, or a time of day alone.

    cells    text, or stamps where all were found to be ISO 8601; none blank
    line     (n,) file lines

    Raises ReadError: unreadable-time, ambiguous-dates, ambiguous-times.
    """
    stamps, kind = cells, "local"
    if cells.dtype.kind != "M":
        text, kind = _as_iso(cells, line, name, date_order)
        stamps = _one_by_one(text, cells, line, name)
    if stamps.dt.tz is not None:
        return _elapsed(stamps.dt.tz_convert("UTC").dt.tz_localize(None), "absolute", line, name)
    if kind == "clock" or zone is None:
        return _elapsed(stamps, kind, line, name)
    return _elapsed(_in_zone(stamps, zone, line, name), "absolute", line, name)


def _as_iso(cells: Texts, line: Lines, name: str, date_order: str | None) -> tuple[Texts, str]:
    """Stamps of any kind read here, written as ISO 8601; and whether they are a time of day alone."""
    text = cells.astype("str").str.strip()
    first = str(text.iloc[0])
    if re.search(_AM_PM, first):
        text = _from_am_pm(text, line, name)
        first = str(text.iloc[0])
    if "," in first:
        text = text.str.replace(",", ".", regex=False)
    if re.match(_CLOCK + "$", first):
        return "1970-01-01T" + text, "clock"
    if re.match(_DAY_FIRST, first):
        text = _ordered(text, first, date_order, line, name)
    elif not re.fullmatch(_ISO, str(text.iloc[0])):
        raise _unreadable(first, int(line[0]), name)
    return text, "local"


def _one_by_one(text: Texts, cells: Texts, line: Lines, name: str) -> Texts:
    """Parse stamps that need a closer look, and name the first that cannot be read."""
    offset = text.str.contains(_OFFSET, regex=True).to_numpy(dtype=bool)
    if offset.any() and not offset.all():
        row = int(np.argmax(offset != offset[0]))
        raise ReadError(
            "unreadable-time",
            f"Line {line[row]}, column {quoted(name)}: {quoted(str(cells.iloc[row]))} and the first row differ in "
            "having an offset; export all stamps with one.",
            {"line": int(line[row])},
        )
    stamps = pd.to_datetime(text, format="ISO8601", utc=True, errors="coerce", cache=False)
    lost = stamps.isna().to_numpy() | ~text.str.fullmatch(_ISO).to_numpy(dtype=bool)
    if lost.any():
        row = int(np.argmax(lost))
        raise _unreadable(str(cells.iloc[row]), int(line[row]), name, int(lost.sum()))
    return stamps if offset.all() else stamps.dt.tz_localize(None)


def _elapsed(stamps: Texts, kind: str, line: Lines, name: str) -> Stamps:
    """From naive stamps (UTC, or local without a zone) to seconds and a start."""
    unit = "ns" if getattr(stamps.dt, "unit", "ns") == "ns" else "us"
    ticks = stamps.dt.as_unit(unit).to_numpy().astype(np.int64)
    per_second = 1e9 if unit == "ns" else 1e6
    time = (ticks - ticks[0]) / per_second
    start = None
    if kind == "absolute":
        first = ticks[0] / per_second
        if not 0 <= first <= _LAST:
            raise _unreadable(str(stamps.iloc[0]), int(line[0]), name)
        start = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(
            microseconds=int(ticks[0]) // (1000 if unit == "ns" else 1)
        )
    return Stamps(time, start, kind)


def _in_zone(stamps: Texts, zone: ZoneInfo, line: Lines, name: str) -> Texts:
    """Local stamps to naive UTC; the repeated hour of autumn is told apart by the order of the rows."""
    twice = stamps.dt.tz_localize(zone, ambiguous="NaT", nonexistent="NaT")
    lost = twice.isna().to_numpy()
    if not lost.any():
        certain: Texts = twice.dt.tz_convert(None)
        return certain
    try:
        inferred: Texts = stamps.dt.tz_localize(zone, ambiguous="infer").dt.tz_convert(None)
    except ValueError as cause:
        row = int(np.argmax(lost))
        raise ReadError(
            "ambiguous-times",
            f"Line {line[row]}, column {quoted(name)}: {quoted(str(stamps.iloc[row]))} occurs twice "
            f"or never in {printable(str(zone))} (clock change), and the order of the rows does not tell; "
            "export stamps with offset.",
            {"line": int(line[row]), "count": int(lost.sum())},
        ) from cause
    return inferred


def _ordered(text: Texts, first: str, date_order: str | None, line: Lines, name: str) -> Texts:
    """Dates with the year last as ISO 8601; the order of day and month is asked for where no row tells."""
    if date_order == "ymd":
        raise _unreadable(first, int(line[0]), name)
    if date_order == "dmy" or (date_order is None and re.match(r"\d+\.", first)):
        return text.str.replace(_DAY_FIRST, _DMY, regex=True)
    if date_order == "mdy":
        return text.str.replace(_DAY_FIRST, _MDY, regex=True)
    dmy, mdy = (text.str.replace(_DAY_FIRST, order, regex=True) for order in (_DMY, _MDY))
    as_dmy, as_mdy = (pd.to_datetime(t, format="ISO8601", errors="coerce", utc=True) for t in (dmy, mdy))
    if as_dmy.isna().any():
        # Where neither order fits, the parser names the first bad line.
        return mdy
    if as_mdy.isna().any() or as_dmy.equals(as_mdy):
        return dmy
    raise ReadError(
        "ambiguous-dates",
        f"Line {line[0]}, column {quoted(name)}: {quoted(first)} may be {as_dmy.iloc[0]:%d %B %Y} or "
        f'{as_mdy.iloc[0]:%d %B %Y}, and no row decides; pass date_order="dmy" or date_order="mdy".',
        {"line": int(line[0])},
    )


def _from_am_pm(text: Texts, line: Lines, name: str) -> Texts:
    """A 12-hour clock to a 24-hour one."""
    parts = text.str.extract(r"(?i)^(.*?)(\d{1,2})(:\d{2}(?::\d{2}(?:[.,]\d+)?)?) ?([AP])\.?M\.?$")
    hour = pd.to_numeric(parts[1], errors="coerce")
    bad = (parts[3].isna() | ~hour.between(1, 12)).to_numpy()
    if bad.any():
        row = int(np.argmax(bad))
        raise _unreadable(str(text.iloc[row]), int(line[row]), name, int(bad.sum()))
    full = hour.astype(int) % 12 + 12 * (parts[3].str.upper() == "P")
    return parts[0] + full.astype(str).str.zfill(2) + parts[2]


def _unreadable(cell: str, line: int, name: str, count: int = 1) -> ReadError:
    return ReadError(
        "unreadable-time",
        f"Line {line}, column {quoted(name)}: {quoted(cell)} is no time stamp that is read here; export ISO 8601 "
        "(2026-03-02T08:15:00.100Z), epoch or elapsed seconds.",
        {"line": line, "column": printable(name), "count": count},
    )
