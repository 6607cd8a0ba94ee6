"""Checks of a time axis: repeated rows, clocks that run backwards, gaps and jitter."""

from __future__ import annotations

import numpy as np

from ident.errors import ReadError
from ident.findings import Finding
from ident.record.segments import Flags, Floats, Lines, gaps, uniform_step


def without_duplicates(time: Floats, columns: list[Floats], line: Lines) -> tuple[Flags, list[Finding]]:
    """Rows to keep: all but exact repetitions of the row before, which a logger that resends writes.

    time, columns    (n,) each
    line             (n,) file lines
    """
    again = np.diff(time) == 0
    if again.any():
        for column in columns:
            a, b = column[:-1], column[1:]
            again &= (a == b) | (np.isnan(a) & np.isnan(b))
    kept = np.concatenate(([True], ~again))
    count = int(again.sum())
    if count == 0:
        return kept, []
    first = int(line[1:][again][0])
    message = f"{count} rows repeat the row before exactly and were dropped; the first is line {first}."
    return kept, [Finding("dropped-duplicates", "warning", message, {"count": count, "first_line": first})]


def check_increasing(time: Floats, line: Lines) -> None:
    """Raise ReadError time-not-increasing at the first stamp that stands still or goes back."""
    steps = np.diff(time)
    bad = np.flatnonzero(steps <= 0)
    if len(bad) == 0:
        return
    row = int(bad[0]) + 1
    step = float(steps[row - 1])
    if step == 0:
        what = "repeats the stamp of the row before with other values"
        advice = "export stamps with the full resolution of the sampling"
    else:
        what = f"lies {-step:.6g} s before the row before it"
        advice = "sort the rows if they were mixed up, or export the parts before and after a clock change apart"
    raise ReadError(
        "time-not-increasing",
        f"Line {line[row]} {what} ({len(bad)} such rows): {advice}.",
        {"line": int(line[row]), "count": len(bad), "step_s": step},
    )


def findings(time: Floats, line: Lines) -> list[Finding]:
    """gap and irregular-sampling, with figures and places."""
    found = []
    jumps = gaps(time)
    if len(jumps):
        steps = time[jumps] - time[jumps - 1]
        largest = int(np.argmax(steps))
        at = int(jumps[largest])
        found.append(
            Finding(
                "gap",
                "warning",
                f"The record has {len(jumps)} gaps, the largest of {steps[largest]:.6g} s before line {line[at]} "
                f"({time[at]:.6g} s from the start); nothing is fitted across them.",
                {
                    "count": len(jumps),
                    "largest_s": float(steps[largest]),
                    "at_s": float(time[at]),
                    "line": int(line[at]),
                },
            )
        )
    pieces = np.split(time, jumps)
    if any(len(piece) > 2 and uniform_step(piece) is None for piece in pieces):
        steps = np.delete(np.diff(time), jumps - 1)
        low, middle, high = (float(q) for q in np.quantile(steps, (0.0, 0.5, 1.0)))
        found.append(
            Finding(
                "irregular-sampling",
                "warning",
                f"The rows are not evenly spaced: steps of {low:.6g} to {high:.6g} s, the median {middle:.6g} s.",
                {
                    "shortest_step_s": low,
                    "median_step_s": middle,
                    "longest_step_s": high,
                    "step_std_s": float(np.std(steps)),
                },
            )
        )
    return found
