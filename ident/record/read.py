"""read_csv: one log file to a LoopRecord, with everything that was assumed on the way as findings."""

from __future__ import annotations

from datetime import UTC, datetime
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

import numpy as np
import pandas as pd

from ident.errors import ReadError
from ident.findings import Finding
from ident.record import axis, quality
from ident.record.columns import Columns, Mapped, map_columns
from ident.record.dialect import Dialect, sniff
from ident.record.encoding import LogSource, load
from ident.record.numbers import Numbers, to_numbers
from ident.record.quote import printable, quoted
from ident.record.record import LoopRecord, Source, exclusions
from ident.record.table import Table, read_table
from ident.record.times import DATE_ORDERS, Stamps, from_numbers, from_text, is_iso
from ident.record.vocabulary import TIME_UNITS, UTC_NAMES

BAD_QUALITY = "bad quality"


def read_csv(
    source: LogSource,
    *,
    columns: Columns | None = None,
    zone: str | None = None,
    date_order: str | None = None,
    start: datetime | str | None = None,
    counts_per_rev: float | None = None,
) -> LoopRecord:
    """Read a CSV log of one speed loop.

    source          path, bytes or binary file; delimiter , ; or tab, decimal point or comma
    columns         {"time": ..., "setpoint": ..., "command": ..., "speed": ...}: header names, or positions
                    from 0; what is left out is mapped by the header's words
    zone            name of the time zone of stamps without offset, such as "Europe/Berlin"
    date_order      "dmy" or "mdy" where the dates do not tell
    start           time of the first row, for logs with elapsed time only: an aware datetime or ISO 8601,
                    local where `zone` is given
    counts_per_rev  encoder counts are not converted yet: refused

    Returns a LoopRecord whose `source` holds sha256, rows, columns and findings.
    Raises ReadError, its message naming line and column where there is one.
    """
    if counts_per_rev is not None:
        raise ReadError(
            "not-offered", "Encoder counts are not converted yet: convert counts to speed before the upload."
        )
    if date_order is not None and date_order not in DATE_ORDERS:
        raise ReadError("bad-option", f"date_order is one of {', '.join(DATE_ORDERS)}; not {quoted(str(date_order))}.")
    place = _zone(zone)
    begin = _start(start, place)

    body = load(source)
    dialect = sniff(body.text)
    mapped = map_columns(dialect.header, dialect.width, columns)
    table = read_table(body.text, dialect, time=_iso_column(body.text, mapped, dialect))
    bad, judged = quality.judge(table, mapped)
    findings = [*body.findings, *_unread(mapped, dialect), *table.findings, *judged]
    rows = len(table.line)

    stamps = _stamps(table, mapped, dialect.decimal, place, date_order)
    numbers = {
        role: to_numbers(table.cells[i], name=mapped.headers[role], decimal=dialect.decimal, line=table.line)
        for role, i in mapped.index.items()
        if role != "time" and not (role == "setpoint" and table.cells[i].isna().all())
    }
    kept, dropped = axis.without_duplicates(stamps.time, [n.values for n in numbers.values()], table.line)
    findings += [
        *dropped,
        *_missing(numbers, mapped, rows),
        *_dated(stamps, begin),
        *_unit_assumed(stamps, mapped),
    ]
    time = stamps.time[kept]
    values = {role: n.values[kept] for role, n in numbers.items()}
    axis.check_increasing(time, table.line[kept])
    findings += axis.findings(time, table.line[kept])
    return LoopRecord(
        time,
        values["command"],
        values["speed"],
        values.get("setpoint"),
        speed_unit=mapped.units["speed"] or mapped.units.get("setpoint", ""),
        command_unit=mapped.units["command"],
        start=stamps.start or begin,
        excluded=exclusions(bad[kept], BAD_QUALITY),
        source=Source(body.sha256, rows, mapped.headers, tuple(findings)),
    )


def _zone(zone: str | None) -> ZoneInfo | None:
    if zone is None:
        return None
    try:
        return ZoneInfo(zone)
    except (ZoneInfoNotFoundError, ValueError, OSError) as cause:
        raise ReadError(
            "bad-option",
            f'There is no time zone {quoted(str(zone))}: give a name such as "Europe/Berlin" or "UTC".',
        ) from cause


def _start(start: datetime | str | None, zone: ZoneInfo | None) -> datetime | None:
    if start is None:
        return None
    try:
        begin = datetime.fromisoformat(start) if isinstance(start, str) else start
    except ValueError as cause:
        raise ReadError(
            "bad-option", f"start {quoted(str(start))} is no ISO 8601 time, such as 2026-03-02T08:15:00Z."
        ) from cause
    if begin.utcoffset() is None:
        if zone is None:
            raise ReadError("bad-option", "start needs an offset (2026-03-02T08:15:00Z), or give the zone too.")
        begin = begin.replace(tzinfo=zone)
    return begin.astimezone(UTC)


def _iso_column(text: bytes, mapped: Mapped, dialect: Dialect) -> int | None:
    """The time column if it may be parsed as ISO 8601 on the way; pandas also takes words ("now") for stamps."""
    time = mapped.index["time"]
    plain = mapped.date is None and is_iso(dialect.first[time])
    # One letter is found much faster than a word, and clean rows have none.
    worded = text.find(b"o", dialect.offset) >= 0 and (b"now" in text or b"today" in text)
    return time if plain and not worded else None


def _stamps(table: Table, mapped: Mapped, decimal: str, zone: ZoneInfo | None, date_order: str | None) -> Stamps:
    name = mapped.headers["time"]
    cells = table.cells[mapped.index["time"]]
    blank = cells.isna().to_numpy()
    if mapped.date is not None:
        blank = blank | table.cells[mapped.date].isna().to_numpy()
    if blank.any():
        row = int(np.argmax(blank))
        raise ReadError(
            "unreadable-time",
            f"Line {table.line[row]}, column {quoted(name)}: the time stamp is missing; delete that row or fill it.",
            {"line": int(table.line[row]), "column": printable(name), "count": int(blank.sum())},
        )
    if mapped.date is not None:
        cells = table.cells[mapped.date].astype("str").str.strip() + " " + cells.astype("str").str.strip()
    if cells.dtype.kind in "iuf" or (cells.dtype.kind != "M" and _mostly_numbers(cells)):
        values = to_numbers(cells, name=name, decimal=decimal, line=table.line)
        lost = np.isnan(values.values)
        if lost.any():
            row = int(np.argmax(lost))
            raise ReadError(
                "unreadable-time",
                f"Line {table.line[row]}, column {quoted(name)}: {quoted(str(cells.iloc[row]))} is "
                "no number of seconds.",
                {"line": int(table.line[row]), "column": printable(name), "count": int(lost.sum())},
            )
        exact = cells.to_numpy(dtype=np.int64) if cells.dtype.kind == "i" else values.values
        scale = TIME_UNITS.get(mapped.units["time"].casefold())
        return from_numbers(exact, scale=scale, name=name, line=int(table.line[0]))
    if zone is None and mapped.units["time"].casefold() in UTC_NAMES:
        zone = ZoneInfo("UTC")
    return from_text(cells, table.line, name=name, zone=zone, date_order=date_order)


def _mostly_numbers(cells: pd.Series) -> bool:
    try:
        float(str(cells.iloc[0]).replace(",", "."))
    except ValueError:
        return False
    return True


def _missing(numbers: dict[str, Numbers], mapped: Mapped, rows: int) -> list[Finding]:
    found = []
    if "setpoint" in mapped.index and "setpoint" not in numbers:
        message = f"The setpoint column ({quoted(mapped.headers['setpoint'])}) is empty and was not used."
        found.append(Finding("missing-values", "warning", message, {"role": "setpoint", "count": rows}))
    for role, column in numbers.items():
        lost = column.blank + column.unread
        if not lost:
            continue
        words = ", ".join(f"{word} ({count})" for word, count in column.words.items())
        also = f"; in their place stood {words}" if words else ""
        matter = "those rows are left out" if role != "setpoint" else "the setpoint is unknown there"
        found.append(
            Finding(
                "missing-values",
                "error" if 2 * lost > rows and role != "setpoint" else "warning",
                f"{lost} of {rows} rows have no number for {role} "
                f"({quoted(mapped.headers[role])}): {matter}{also}. Blank cells are not taken to mean unchanged.",
                {
                    "role": role,
                    "count": lost,
                    "blank": column.blank,
                    **{f"word: {w}": c for w, c in column.words.items()},
                },
            )
        )
    return found


def _dated(stamps: Stamps, begin: datetime | None) -> list[Finding]:
    if stamps.start is not None:
        if begin is None:
            return []
        return [Finding("start-ignored", "info", "The stamps carry their own date, so the start given was not used.")]
    if begin is not None:
        return []
    if stamps.kind == "local":
        message = "The stamps carry no offset and no zone was given: elapsed times hold, but the start is unknown."
        return [Finding("zone-unknown", "warning", f'{message} Pass zone, for example "Europe/Berlin".')]
    return [Finding("date-unknown", "info", "The log has no date: pass start to place it in time.")]


def _unread(mapped: Mapped, dialect: Dialect) -> list[Finding]:
    if mapped.unread == 0:
        return []
    message = (
        f"{mapped.unread} lines between the header and the first row of numbers (line {dialect.line}) were not read."
    )
    return [Finding("unread-lines", "info", message, {"count": mapped.unread, "first_row_line": dialect.line})]


def _unit_assumed(stamps: Stamps, mapped: Mapped) -> list[Finding]:
    """Whole numbers without a unit may be seconds, milliseconds or a row count."""
    if stamps.kind != "elapsed" or mapped.units["time"] or not np.array_equal(stamps.time, np.round(stamps.time)):
        return []
    message = (
        f"Column {quoted(mapped.headers['time'])} holds whole numbers and names no unit: they were read as seconds. "
        'If they are milliseconds, name the column "time [ms]".'
    )
    return [Finding("time-unit-assumed", "warning", message, {"unit": "s"})]
