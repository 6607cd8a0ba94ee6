"""From the columns of a log to rows in order, by its layout: wide, long or paired."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.errors import ReadError
from ident.findings import Finding
from ident.record import numbers, words
from ident.record.clock import Ordered, ordered
from ident.record.columns import Mapped, map_tags
from ident.record.numbers import Numbers, to_numbers
from ident.record.options import Options
from ident.record.own_clocks import Merged, Signal, merge
from ident.record.quote import counted, quoted
from ident.record.segments import Flags, Floats, Lines
from ident.record.stamps import stamped
from ident.record.table import Table
from ident.record.times import Stamps
from ident.record.words import Words

SPARSE = 0.2  # share of blank cells from which a column may be reported on change
ANEW = 0.95  # share of its reports that then differ from the one before


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """Rows in order.

    time      (n,), s, strictly increasing, on the axis of `stamps`
    values    {role: (n,)}
    read      {role: the column as numbers}, for what is said of it
    breaks    (row, s) where the clock was set back
    bad       (n,), rows of bad quality
    mode      words of the mode column, or None
    held      (n,), rows whose speed is its last report, of a log that reports on change; else None
    """

    time: Floats
    stamps: Stamps
    values: dict[str, Floats]
    read: dict[str, Numbers]
    line: Lines
    breaks: tuple[tuple[int, float], ...]
    bad: Flags
    mode: Words | None
    headers: dict[str, str]
    why: dict[str, str]
    dropped: dict[str, int]
    findings: tuple[Finding, ...]
    held: Flags | None = None


def wide(table: Table, mapped: Mapped, options: Options, decimal: str, bad: Flags) -> Rows:
    """One row per sample."""
    axis = stamped(table, mapped, options, decimal, position=mapped.index["time"], name=mapped.headers["time"])
    kept, line = axis.kept, table.line[axis.kept]
    read = {
        role: to_numbers(numbers.chosen(cells, kept), name=mapped.headers[role], decimal=decimal, line=line)
        for role, i in mapped.index.items()
        if role != "time" and not ((cells := table.numbers[i]).blank.all() and role == "setpoint")
    }
    order = ordered(axis.stamps.time, [n.values for n in read.values()], line, local=axis.stamps.kind == "local")
    # Rows that stand in order already are not copied.
    pick = order.rows if order.findings else slice(None)
    values = {role: n.values[pick] for role, n in read.items()}
    blank = {role: n.blank[pick] for role, n in read.items()}
    rows = np.arange(len(order.rows))
    time, line = order.time, line[pick]
    findings = [*axis.findings, *order.findings]
    held, unreported = _held_roles(values, blank, options), None
    if held & {"command", "speed"}:
        merged = _merged_columns(time, values, blank, line, held, bad[kept][order.rows])
        rows = np.searchsorted(time, merged.time)
        findings += merged.findings
        time, values, line, unreported = merged.time, merged.values, merged.line, merged.held
    elif held:
        values["setpoint"] = _held(values["setpoint"], blank["setpoint"])
        message = "The setpoint is logged where it changes and holds in between."
        findings.append(Finding("setpoint-held", "info", message, {"reports": int((~blank["setpoint"]).sum())}))
    mode = None
    if mapped.mode is not None:
        of_rows = table.words[mapped.mode].codes[kept][order.rows][rows]
        mode = Words(of_rows, table.words[mapped.mode].words)
    return Rows(
        time,
        axis.stamps,
        values,
        read,
        line,
        tuple((int(np.searchsorted(rows, row)), by) for row, by in order.breaks),
        bad[kept][order.rows][rows],
        mode,
        mapped.headers,
        mapped.why,
        order.dropped | ({"no time stamp": int((~kept).sum())} if not kept.all() else {}),
        tuple(findings),
        unreported,
    )


def long(table: Table, mapped: Mapped, options: Options, decimal: str, bad: Flags) -> Rows:
    """One row per signal and report; each signal on its own clock."""
    axis = stamped(table, mapped, options, decimal, position=mapped.index["time"], name=mapped.headers["time"])
    assert mapped.tag is not None  # a long log has one
    tags = words.chosen(table.words[mapped.tag], axis.kept)
    roles, why = map_tags(tuple(tags.counts()), options.columns)
    cells = numbers.chosen(table.numbers[mapped.index["value"]], axis.kept)
    line = table.line[axis.kept]
    read, signals, dropped = {}, {}, dict[str, int]()
    findings = list(axis.findings)
    for role, tag in roles.items():
        mine = tags.where([tag])
        read[role] = to_numbers(numbers.chosen(cells, mine), name=tag, decimal=decimal, line=line[mine])
        value = np.where(bad[axis.kept][mine], np.nan, read[role].values)
        signals[role] = _signal(axis.stamps.time[mine], value, line[mine], role, dropped, findings)
    other = len(tags.counts()) - len(roles)
    if other:
        message = counted(other, "other signal in the log was not used.", "other signals in the log were not used.")
        findings.append(Finding("signals-unused", "info", message, {"count": other}))
    headers = {"time": mapped.headers["time"], **roles}
    why = {"time": mapped.why.get("time", ""), **why}
    return _from_signals(signals, axis.stamps, read, headers, why, dropped, findings)


def paired(table: Table, mapped: Mapped, options: Options, decimal: str, bad: Flags) -> Rows:
    """Each signal beside its own time column, to its own length."""
    read, signals, dropped = {}, {}, dict[str, int]()
    findings: list[Finding] = []
    axes = {
        role: stamped(table, mapped, options, decimal, position=at, name=mapped.headers["time"], sparse=True)
        for role, at in mapped.clocks.items()
        if role != "time"
    }
    base = axes["speed"].stamps
    for role, axis in axes.items():
        cells = numbers.chosen(table.numbers[mapped.index[role]], axis.kept)
        line = table.line[axis.kept]
        if cells.blank.all() and role == "setpoint":
            continue
        read[role] = to_numbers(cells, name=mapped.headers[role], decimal=decimal, line=line)
        # Origins are whole microseconds: their difference is exact.
        time = axis.stamps.time + round(axis.stamps.origin - base.origin, 6)
        value = np.where(bad[axis.kept], np.nan, read[role].values)
        signals[role] = _signal(time, value, line, role, dropped, findings)
    return _from_signals(signals, base, read, mapped.headers, mapped.why, dropped, findings)


def _signal(
    time: Floats, value: Floats, line: Lines, role: str, dropped: dict[str, int], findings: list[Finding]
) -> Signal:
    order: Ordered = ordered(time, [value], line)
    if order.breaks:
        row, by = order.breaks[0]
        at = int(line[order.rows[row]])
        raise ReadError(
            "time-not-increasing",
            f"Line {at}: the stamps of the {role} go back by {-by:.6g} s, and each signal has its own: export the "
            "parts before and after the clock was set apart.",
            {"line": at, "count": len(order.breaks), "step_s": -by},
        )
    for reason, count in order.dropped.items():
        dropped[reason] = dropped.get(reason, 0) + count
    findings += [f for f in order.findings if f.code not in {g.code for g in findings}]
    return Signal(order.time, value[order.rows], line[order.rows])


def _from_signals(
    signals: dict[str, Signal],
    stamps: Stamps,
    read: dict[str, Numbers],
    headers: dict[str, str],
    why: dict[str, str],
    dropped: dict[str, int],
    findings: list[Finding],
) -> Rows:
    merged = merge(signals)
    return Rows(
        merged.time,
        stamps,
        merged.values,
        read,
        merged.line,
        (),
        np.zeros(len(merged.time), dtype=np.bool_),
        None,
        headers,
        why,
        dropped,
        (*findings, *merged.findings),
        merged.held,
    )


def _held_roles(values: dict[str, Floats], blank: dict[str, Flags], options: Options) -> set[str]:
    """Columns whose blanks mean "unchanged": often blank, and never reporting the same value twice."""
    some = {role for role, flags in blank.items() if flags.any()}
    if options.blanks is not None:
        return some if options.blanks == "held" else set()
    rowwise = np.logical_and.reduce(list(blank.values()))  # a row without any value is a failure, no report
    held = set()
    for role in some & {"command", "setpoint"}:
        here = blank[role] & ~rowwise
        reports = values[role][~blank[role]]
        anew = np.mean(np.diff(reports) != 0) if len(reports) > 1 else 1.0
        if here.mean() >= SPARSE and anew >= ANEW:
            held.add(role)
    # Blanks of the speed alone may be a slow sensor as well as an unchanged one.
    return held | ({"speed"} & some if "command" in held else set())


def _held(values: Floats, blank: Flags) -> Floats:
    at = np.maximum.accumulate(np.where(blank, -1, np.arange(len(values))))
    return np.where(at >= 0, values[np.maximum(at, 0)], np.nan)


def _merged_columns(
    time: Floats, values: dict[str, Floats], blank: dict[str, Flags], line: Lines, held: set[str], bad: Flags
) -> Merged:
    signals = {}
    for role, column in values.items():
        reported = ~blank[role] if role in held else np.ones(len(time), dtype=np.bool_)
        value = np.where(bad[reported], np.nan, column[reported])
        if role == "setpoint" and not reported.any():
            continue
        if not reported.any():
            raise ReadError("no-numbers", f"Column {quoted(role)} has no numbers.", {"column": role})
        signals[role] = Signal(time[reported], value, line[reported])
    return merge(signals, on_change=True)
