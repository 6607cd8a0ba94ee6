"""read_csv: one log file to a LoopRecord, with everything that was assumed on the way as findings."""

from __future__ import annotations

from dataclasses import replace
from datetime import datetime, timedelta

import numpy as np

from ident.errors import ReadError
from ident.findings import Finding
from ident.record import axis, character, modes, quality, rows, speed_units
from ident.record.columns import Columns, Mapped, map_columns
from ident.record.counts import UNIT, speed_from_counts
from ident.record.dialect import Dialect, sniff
from ident.record.encoding import Body, LogSource, load
from ident.record.grouping import OtherDecimal
from ident.record.numbers import Numbers
from ident.record.options import Options, checked
from ident.record.quote import counted, quoted
from ident.record.record import LoopRecord, Source, Understood, exclusions
from ident.record.rows import Rows
from ident.record.segments import gaps, outages
from ident.record.stamps import told
from ident.record.table import Wanted, read_table
from ident.record.times import is_iso

BAD_QUALITY = "bad quality"
_LAYOUTS = {"wide": rows.wide, "long": rows.long, "paired": rows.paired}


def read_csv(
    source: LogSource,
    *,
    columns: Columns | None = None,
    zone: str | None = None,
    date_order: str | None = None,
    start: datetime | str | None = None,
    counts_per_rev: float | None = None,
    blanks: str | None = None,
) -> LoopRecord:
    """Read a CSV log of one speed loop.

    source          path, bytes or binary file; delimiter , ; or tab, decimal point or comma; one row per sample,
                    one row per signal and report, or each signal beside its own time
    columns         {"time": ..., "setpoint": ..., "command": ..., "speed": ...}: header names (or tags), or positions
                    from 0; what is left out is mapped by the header's words
    zone            name of the time zone of stamps without offset, such as "Europe/Berlin"
    date_order      "dmy", "mdy" or "ymd" where the dates do not tell
    start           time of the first row, for logs with elapsed time only: an aware datetime or ISO 8601,
                    local where `zone` is given
    counts_per_rev  the speed column is an encoder position of so many counts per revolution
    blanks          "held" or "missing": what an empty cell means, where the log does not tell

    Returns a LoopRecord whose `source` holds sha256, rows, columns, findings and how the log was understood.
    Raises ReadError, its message naming line and column where there is one.
    """
    options = checked(columns, zone, date_order, start, counts_per_rev, blanks)
    body = load(source)
    dialect = sniff(body.head)
    try:
        return _read(body, dialect, options)
    except OtherDecimal:
        dialect = replace(dialect, decimal="," if dialect.decimal == "." else ".")
    try:
        return _read(body, dialect, options)
    except OtherDecimal as cause:
        raise ReadError(
            "ambiguous-numbers", "Some columns have a decimal comma and some a decimal point: export one of them."
        ) from cause


def _read(body: Body, dialect: Dialect, options: Options) -> LoopRecord:
    mapped = map_columns(dialect.header, dialect.width, options.columns, counts=options.counts_per_rev is not None)
    table = read_table(body, dialect, _wanted(mapped, dialect))
    bad, judged = quality.judge({name: table.words[i] for i, name in mapped.quality.items()}, table.line)
    got = _LAYOUTS[mapped.layout](table, mapped, options, dialect.decimal, bad)
    findings = [*body.findings, *_unread(mapped, dialect), *table.findings, *judged, *got.findings]
    speed_unit, command_unit = _unit("speed", mapped, got), _unit("command", mapped, got)
    speed_unit = speed_unit or _unit("setpoint", mapped, got)
    breaks = tuple(row for row, _ in got.breaks)
    speed, setpoint = got.values["speed"], got.values.get("setpoint")
    if options.counts_per_rev is not None:
        name = got.headers["speed"]
        speed, resolution = speed_from_counts(speed, got.time, breaks, options.counts_per_rev, name)
        findings.append(resolution)
        speed_unit = UNIT
    spans, said = modes.mode_spans(got.mode, got.headers.get("mode", "mode")) if got.mode else ((), [])
    if setpoint is not None:
        setpoint, tracked = modes.without_tracking(setpoint, speed, spans)
        setpoint, converted = speed_units.in_speed_unit(setpoint, _unit("setpoint", mapped, got), speed_unit)
        said += [*tracked, *converted]
    findings += [*said, *_missing(got, mapped, findings), *told(got.stamps, options.start, mapped)]
    jumps = gaps(got.time) if got.held is None else outages(got.time, speed, got.held)
    findings += axis.findings(got.time, got.line, jumps, breaks)
    findings += speed_units.cell_units({role: n.units for role, n in got.read.items() if n.units})
    begin = got.stamps.start or options.start
    looks = {"speed": character.character(speed), "command": character.character(got.values["command"])}
    units = {"speed": speed_unit, "command": command_unit}
    step = float(np.median(np.diff(got.time))) if len(got.time) > 1 else None
    findings += character.findings({r: c for r, c in looks.items() if c}, units, step)
    understood = Understood(
        mapped.layout,
        body.encoding,
        dialect.delimiter,
        dialect.decimal,
        got.why,
        got.stamps.told(float(got.time[0])),
        got.stamps.told(float(got.time[-1]) + sum(step for _, step in got.breaks)),
        table.dropped | got.dropped,
        got.breaks,
    )
    return LoopRecord(
        got.time,
        got.values["command"],
        speed,
        setpoint,
        speed_unit=speed_unit,
        command_unit=command_unit,
        start=begin + timedelta(seconds=float(got.time[0])) if begin else None,
        source=Source(body.sha256, table.rows, got.headers, tuple(findings), understood),
        excluded=exclusions(got.bad, BAD_QUALITY),
        breaks=breaks,
        modes=spans,
        held=got.held,
    )


def _wanted(mapped: Mapped, dialect: Dialect) -> Wanted:
    clocks = set(mapped.clocks.values()) - {-1} or {mapped.index["time"]}
    iso = mapped.date is None and all(is_iso(dialect.first[i]) for i in clocks)
    others = [mapped.mode, mapped.tag, *mapped.quality]
    return Wanted(
        tuple(clocks | ({mapped.date} if mapped.date is not None else set())),
        tuple(i for role, i in mapped.index.items() if role != "time"),
        tuple(i for i in others if i is not None),
        iso,
    )


def _unit(role: str, mapped: Mapped, got: Rows) -> str:
    """The unit of a role by its header or units row, else by the cells where they agree."""
    if role not in got.read:
        return ""
    cells = got.read[role].units
    return mapped.units.get(role, "") or (next(iter(cells)) if len(cells) == 1 else "")


def _missing(got: Rows, mapped: Mapped, said: list[Finding]) -> list[Finding]:
    found = []
    if "setpoint" in mapped.index and "setpoint" not in got.read:
        message = f"The setpoint column ({quoted(mapped.headers['setpoint'])}) is empty and was not used."
        found.append(Finding("missing-values", "warning", message, {"role": "setpoint", "count": len(got.time)}))
    for role, column in got.read.items():
        found += _missing_of(role, column, got.headers[role], held=any(f.code in _HELD for f in said))
    return found


_HELD = ("exception-reported", "setpoint-held")


def _missing_of(role: str, column: Numbers, header: str, *, held: bool) -> list[Finding]:
    blank = 0 if held else int(column.blank.sum())
    lost, rows_ = blank + column.unread, len(column.values)
    if not lost:
        return []
    words = ", ".join(f"{word} ({count})" for word, count in column.words.items())
    have = "has" if lost == 1 else "have"
    also = f"; in their place stood {words}" if words else ""
    matter = "those rows are left out" if role != "setpoint" else "the setpoint is unknown there"
    unchanged = ' If an empty cell means "unchanged", give the option "blanks" as held.' if blank else ""
    return [
        Finding(
            "missing-values",
            "error" if 2 * lost > rows_ and role != "setpoint" else "warning",
            f"{lost} of {rows_} rows {have} no number for {role} ({quoted(header)}): {matter}{also}.{unchanged}",
            {"role": role, "count": lost, "blank": blank, **{f"word: {w}": c for w, c in column.words.items()}},
        )
    ]


def _unread(mapped: Mapped, dialect: Dialect) -> list[Finding]:
    if mapped.unread == 0:
        return []
    message = (
        counted(mapped.unread, "line was", "lines were")
        + f" not read between the header and the first row of numbers (line {dialect.line})."
    )
    return [Finding("unread-lines", "info", message, {"count": mapped.unread, "first_row_line": dialect.line})]
