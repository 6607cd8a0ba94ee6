"""The order of rows in time: rows repeated or mixed up, stamps shared by several rows, clocks that were set back."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from ident.errors import ReadError
from ident.findings import Finding
from ident.record.quote import counted
from ident.record.segments import IRREGULAR_GAP, STEADY_GAP, Flags, Floats, Lines, steady_step

Rows = NDArray[np.intp]

SHARED = 0.3  # share of repeated stamps above which the clock is coarse, and rows are not repetitions
BACKWARDS = 0.9  # share of steps back in a log written newest first
CONFLICTS = 0.02  # share of rows with a stamp already taken above which the log is refused, beyond FEW
FEW = 2
NEAREST = 0.5  # of the step: rows of one steady clock do not lie nearer
MOST_STEPS = 50  # clock steps in one log
MOST_LOOKS = 500  # rows that go back, to be told from clock steps one by one
HOUR = 3600.0


@dataclass(frozen=True, slots=True, eq=False)
class Ordered:
    """Rows put in order.

    rows      (n,), rows of the log to keep, in their new order
    time      (n,), s, strictly increasing
    breaks    rows of the result before which the clock was set back, and by how much, s
    dropped   {reason: rows}
    """

    rows: Rows
    time: Floats
    breaks: tuple[tuple[int, float], ...]
    dropped: dict[str, int]
    findings: tuple[Finding, ...]


def ordered(time: Floats, columns: list[Floats], line: Lines, *, local: bool = False) -> Ordered:
    """Put rows in order.

    time      (n,), s, as stamped
    columns   (n,) each: what tells a repeated row from another one
    line      (n,) file lines
    local     stamps are local, without a zone: an hour back may be the end of summer time

    Raises ReadError: time-not-increasing, conflicting-rows, shared-stamps.
    """
    rows = np.arange(len(time))
    steps = np.diff(time)
    if len(steps) == 0 or steps.min() > 0:
        return Ordered(rows, time, (), {}, ())
    found: list[Finding] = []
    moved = steps[steps != 0]
    if len(moved) and np.mean(moved < 0) >= BACKWARDS:
        rows, found = rows[::-1], [_said("rows-reversed", "info", "The rows stand newest first and were turned round.")]
    time = time[rows]
    if np.mean(steps == 0) > SHARED and not _repeated(time, columns, rows).all():
        time = _spread(time, line[rows])
        share = int(np.sum(steps == 0))
        message = (
            counted(share, "row shares its stamp", "rows share their stamp")
            + " with the row before, because the stamps are coarser than the sampling; the rows were spread evenly."
        )
        found.append(_said("stamps-spread", "warning", message, count=share))
    late, shifts = _late(time, [column[rows] for column in columns], line[rows])
    for row, by in shifts:
        time[row:] += by
    if late.any():
        order = np.argsort(time, kind="stable")
        time, rows = time[order], rows[order]
        first = int(line[np.flatnonzero(late)[0]])
        came = counted(
            int(late.sum()), "row came late and was put in its place", "rows came late and were put in their place"
        )
        message = f"{came}; the first is line {first}."
        found.append(_said("rows-sorted", "warning", message, count=int(late.sum()), first_line=first))
    kept, dropped, more = _unique(time, columns, rows, line)
    breaks = tuple((int(np.count_nonzero(kept[:row])), -by) for row, by in shifts)
    for row, by in shifts:
        hint = ""
        if local and abs(abs(by) - HOUR) < 0.01 * HOUR:
            hint = ' It is one hour: for the end of summer time, give the option "zone".'
        found.append(
            _said(
                "clock-step",
                "warning",
                f"Line {line[rows[row]]} lies {by:.6g} s before its turn: the clock was set back. The record is split "
                f"there, and later times count on from the row before.{hint}",
                count=len(shifts),
                line=int(line[rows[row]]),
                step_s=-by,
            )
        )
    if len(shifts) > 1:
        found = [f for f in found if f.code != "clock-step"] + [f for f in found if f.code == "clock-step"][:1]
    return Ordered(rows[kept], time[kept], breaks, dropped, (*found, *more))


def _repeated(time: Floats, columns: list[Floats], rows: Rows) -> Flags:
    """Of the rows that share the stamp of the row before, those that repeat it exactly."""
    again = np.flatnonzero(np.diff(time) == 0)
    same = np.ones(len(again), dtype=np.bool_)
    for column in columns:
        a, b = column[rows[again]], column[rows[again + 1]]
        same &= (a == b) | (np.isnan(a) & np.isnan(b))
    return same


def _spread(time: Floats, line: Lines) -> Floats:
    """Rows that share coarse stamps, evenly between them; refused where no even clock explains the stamps."""
    first = np.concatenate(([0], np.flatnonzero(np.diff(time)) + 1))
    stamps, counts = time[first], np.diff(np.append(first, len(time)))
    ticks = np.diff(stamps)
    tick = float(np.median(ticks)) if len(ticks) else 0.0
    # A stretch without a missing tick has one clock.
    starts = np.concatenate(([0], np.flatnonzero(np.abs(ticks - tick) > 0.01 * tick) + 1, [len(stamps)]))
    out = time.copy()
    for a, b in zip(starts[:-1].tolist(), starts[1:].tolist(), strict=True):
        rows = slice(int(first[a]), int(first[a] + counts[a:b].sum()))
        inner = counts[a + 1 : b - 1] if b - a > 2 else counts[a:b]
        step = tick * (b - a - 2) / inner.sum() if b - a > 2 else tick / inner.max(initial=1)
        if tick <= 0 or np.ptp(inner) > 1:
            row = int(first[a + int(np.argmax(np.abs(inner - np.median(inner)))) + (b - a > 2)])
            raise ReadError(
                "shared-stamps",
                f"Many rows share a stamp, and from line {line[row]} on not as many as elsewhere: the time between "
                "rows is unknown; export stamps with the full resolution of the sampling.",
                {"line": int(line[row])},
            )
        k = np.round(np.arange(rows.stop - rows.start) * step, 12)
        # The latest even clock whose rows all fall within the tick of their stamp starts as early as it may.
        out[rows] = np.round(k + float(np.max(time[rows] - k)), 12)
    return out


def _late(time: Floats, columns: list[Floats], line: Lines) -> tuple[Flags, list[tuple[int, float]]]:
    """Rows to sort into their place, and (row, s to add from there on) where the clock was set back."""
    time = time.copy()
    late = np.zeros(len(time), dtype=np.bool_)
    shifts: list[tuple[int, float]] = []
    step, steady = _step(np.sort(time))
    if not steady:
        step, steady = _step(time)
    limit = (STEADY_GAP if steady else IRREGULAR_GAP) * step
    nearest = NEAREST * step if steady else 0.0
    if np.any(np.diff(time) < 0) and steady and _all_fit(time, columns, nearest, limit):
        return time < np.maximum.accumulate(time), []
    looked = 0
    while len(back := np.flatnonzero(np.diff(time) < 0)):
        row = int(back[0]) + 1
        stop = row + 1
        while stop < len(time) and time[row] <= time[stop] < time[row - 1] and stop - row < 1000:
            stop += 1
        # Rows that came late are followed by one that goes on where the log was; their place is still free.
        looked += 1
        fits = stop < len(time) and time[stop] > time[row - 1] and stop - row < len(time) // 4
        if fits and _free(time, columns, slice(row, stop), nearest, limit):
            late[row:stop] = True
            time[row:stop] = time[row - 1]
            continue
        shifts.append((row, float(time[row - 1] + step - time[row])))
        time[row:] += shifts[-1][1]
        if len(shifts) > MOST_STEPS or looked > MOST_LOOKS:
            raise ReadError(
                "time-not-increasing",
                f"Line {line[shifts[0][0]]} lies {shifts[0][1]:.6g} s before its turn, and more than {MOST_STEPS} rows "
                "like it: sort the rows, or export the stamps of one clock.",
                {"line": int(line[shifts[0][0]]), "count": len(shifts), "step_s": -shifts[0][1]},
            )
    return late, shifts


def _step(time: Floats) -> tuple[float, bool]:
    steps = np.diff(time)
    return steady_step(steps[steps > 0])


def _free(time: Floats, columns: list[Floats], run: slice, nearest: float, limit: float) -> bool:
    """Whether the place of rows that came late is still free, or holds the same rows already."""
    others = np.delete(np.arange(len(time)), np.arange(run.start, run.stop))
    others = others[np.argsort(time[others], kind="stable")]
    there, mine = time[others], time[run]
    at = np.searchsorted(there, mine)
    here = np.minimum(at, len(others) - 1)
    same = there[here] == mine
    for column in columns:
        a, b = column[others[here]], column[run]
        same &= (a == b) | (np.isnan(a) & np.isnan(b))
    if same.mean() > 1 - CONFLICTS:
        return True
    if at[-1] == len(others) or at[0] != at[-1]:
        return False
    below = mine[0] - there[at[0] - 1] if at[0] else limit
    above = there[at[0]] - mine[-1]
    return bool(nearest <= below <= limit and max(nearest, 1e-12) <= above <= limit)


def _all_fit(time: Floats, columns: list[Floats], nearest: float, limit: float) -> bool:
    """Whether sorting alone mends the log: every late row finds its place free, or the same row there already."""
    late = time < np.maximum.accumulate(time)
    order = np.argsort(time, kind="stable")
    there, moved = time[order], late[order]
    steps = np.diff(there)
    same = np.zeros(len(steps), dtype=np.bool_)
    same[steps == 0] = _repeated(there, columns, order)
    below, above = np.append(np.nan, steps), np.append(steps, np.nan)
    repeats = np.append(False, same) | np.append(same, False)
    free = (below >= nearest) & (below <= limit) & (above >= nearest) & (above <= limit)
    lost = moved & ~repeats & ~free
    return int(lost.sum()) <= CONFLICTS * int(moved.sum())


def _unique(
    time: Floats, columns: list[Floats], rows: Rows, line: Lines
) -> tuple[Flags, dict[str, int], list[Finding]]:
    """Rows to keep: of those with one stamp the first."""
    taken = np.diff(time, prepend=time[0] - 1) == 0
    if not taken.any():
        return np.ones(len(time), dtype=np.bool_), {}, []
    again = np.flatnonzero(np.diff(time) == 0)
    same = _repeated(time, columns, rows)
    repeated, other = again[same] + 1, again[~same] + 1
    # Within a group of more than two rows each is compared with the one before, and all but the first go.
    found, dropped = [], {}
    if len(repeated):
        first = int(line[rows[repeated]].min())
        repeat = counted(
            len(repeated), "row repeats another exactly and was dropped", "rows repeat another exactly and were dropped"
        )
        message = f"{repeat}; the first is line {first}."
        found.append(_said("dropped-duplicates", "warning", message, count=len(repeated), first_line=first))
        dropped["exact repetition"] = len(repeated)
    if len(other):
        first = int(line[rows[other]].min())
        if len(other) > max(FEW, CONFLICTS * len(time)):
            raise ReadError(
                "conflicting-rows",
                f"Line {first} repeats the stamp of another row with other values ({len(other)} such rows): export "
                "stamps with the full resolution of the sampling, or one log per source.",
                {"line": first, "count": len(other)},
            )
        message = (
            f"{counted(len(other), 'row has', 'rows have')} the stamp of another row but other values; the first of "
            "each was kept. "
            f"The first dropped is line {first}."
        )
        found.append(_said("conflicting-rows", "warning", message, count=len(other), first_line=first))
        dropped["stamp already taken"] = len(other)
    return ~taken, dropped, found


def _said(code: str, severity: str, message: str, **evidence: float | int | str) -> Finding:
    return replace(Finding(code, "info", message, dict(evidence)), severity=severity)  # type: ignore[arg-type]
