"""The stamps of a column, by how its cells are written; rows without a stamp; what was assumed of the date."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from zoneinfo import ZoneInfo

import numpy as np
import pandas as pd

from ident.errors import ReadError
from ident.findings import Finding
from ident.record.columns import Mapped
from ident.record.numbers import read_cells, to_numbers
from ident.record.options import Options
from ident.record.quote import counted, printable, quoted
from ident.record.ragged import FEW, SHORT_SHARE
from ident.record.segments import Flags, Lines
from ident.record.table import Table, TimeCells
from ident.record.times import Stamps, from_numbers, from_text
from ident.record.vocabulary import TIME_UNITS, UTC_NAMES


@dataclass(frozen=True, slots=True, eq=False)
class Stamped:
    """kept (n,), rows of the table that carry a stamp; `stamps` are theirs."""

    stamps: Stamps
    kept: Flags
    findings: tuple[Finding, ...] = ()


def stamped(
    table: Table, mapped: Mapped, options: Options, decimal: str, *, position: int, name: str, sparse: bool = False
) -> Stamped:
    """Read one time column.

    position   of the column
    sparse     rows without a stamp are none of this signal's

    Raises ReadError: unreadable-time, ambiguous-dates, ambiguous-times.
    """
    cells, blank = table.time[position], table.blank[position]
    if mapped.date is not None:
        cells = _beside(table.time[mapped.date], cells)
        blank = blank | table.blank[mapped.date]
    lost = int(blank.sum())
    findings = []
    if lost and not sparse:
        row = int(np.argmax(blank))
        if lost > max(FEW, SHORT_SHARE * len(blank)):
            raise ReadError(
                "unreadable-time",
                f"Line {table.line[row]}, column {quoted(name)}: the time stamp is missing in {lost} rows; delete "
                "those rows or fill it.",
                {"line": int(table.line[row]), "column": printable(name), "count": lost},
            )
        without = counted(lost, "row has no time stamp and was dropped", "rows have no time stamp and were dropped")
        message = f"{without}; the first is line {table.line[row]}."
        evidence: dict[str, float | int | str | bool | None] = {"count": lost, "first_line": int(table.line[row])}
        findings.append(Finding("rows-without-time", "warning", message, evidence))
    kept = ~blank
    if lost:
        cells = cells[kept] if not isinstance(cells, pd.Series) else cells[kept].reset_index(drop=True)
    if not kept.any():
        raise ReadError("unreadable-time", f"Column {quoted(name)} holds no time stamps.", {"column": printable(name)})
    stamps = _read(cells, table.line[kept], mapped, options, decimal, name)
    return Stamped(stamps, kept, tuple(findings))


def _read(cells: TimeCells, line: Lines, mapped: Mapped, options: Options, decimal: str, name: str) -> Stamps:
    unit, texts = mapped.units["time"].casefold(), cells
    if cells.dtype.kind == "S" and _is_number(cells[0].decode("ascii", "replace")):
        column = pd.Series([c.decode("ascii", "replace") for c in cells.tolist()], dtype="str")
        cells = to_numbers(read_cells(column, decimal), name=name, decimal=decimal, line=line).values
    if isinstance(cells, np.ndarray) and cells.dtype.kind in "if":
        bad = ~np.isfinite(cells)
        if bad.any():
            row = int(np.argmax(bad))
            code = "not-finite" if np.isinf(cells[row]) else "unreadable-time"
            said = texts[row].decode("ascii", "replace") if texts.dtype.kind == "S" else str(cells[row])
            raise ReadError(
                code,
                f"Line {line[row]}, column {quoted(name)}: {quoted(said)} is no number of seconds; mend or delete "
                "that row.",
                {"line": int(line[row]), "column": printable(name), "count": int(bad.sum())},
            )
        return from_numbers(cells, scale=TIME_UNITS.get(unit), zone=options.zone, name=name, line=int(line[0]))
    zone = ZoneInfo("UTC") if options.zone is None and unit in UTC_NAMES else options.zone
    return from_text(cells, line, name=name, zone=zone, date_order=options.date_order)


def _beside(date: TimeCells, clock: TimeCells) -> TimeCells:
    """A date column and a time of day as one."""
    first, second = (
        np.char.decode(c, "ascii", "replace") if c.dtype.kind == "S" else np.asarray(c).astype("U40")
        for c in (date, clock)
    )
    joined = np.strings.add(np.strings.add(np.strings.strip(first), " "), np.strings.strip(second))
    return np.char.encode(joined, "ascii", "replace").astype("S40")


def _is_number(text: str) -> bool:
    try:
        float(text.replace(",", "."))
    except ValueError:
        return False
    return True


def told(stamps: Stamps, begin: datetime | None, mapped: Mapped) -> list[Finding]:
    """What was assumed of the date, the zone and the unit of time."""
    found = []
    if stamps.start is not None:
        if begin is not None:
            message = "The stamps carry their own date, so the start given was not used."
            found.append(Finding("start-ignored", "info", message))
    elif stamps.kind == "local" and begin is None:
        message = "The stamps carry no offset and no zone was given: elapsed times hold, but the start is unknown."
        found.append(Finding("zone-unknown", "warning", f'{message} Give the option "zone", such as Europe/Berlin.'))
    elif begin is None:
        found.append(
            Finding("date-unknown", "info", 'The log has no date: give the option "start" to place it in time.')
        )
    if stamps.two_digits:
        message = "The years have two digits: 00 to 69 were read as 2000 to 2069."
        found.append(Finding("two-digit-years", "info", message))
    whole = np.array_equal(stamps.time, np.round(stamps.time))
    if stamps.kind == "elapsed" and not mapped.units["time"] and whole and float(stamps.origin).is_integer():
        message = (
            f"Column {quoted(mapped.headers['time'])} holds whole numbers and names no unit: they were read as "
            'seconds. If they are milliseconds, name the column "time [ms]".'
        )
        found.append(Finding("time-unit-assumed", "warning", message, {"unit": "s"}))
    return found
