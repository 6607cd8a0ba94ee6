"""What a time axis has to say: gaps and jitter."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ident.findings import Finding
from ident.record.segments import Floats, Lines, uniform_step

Rows = NDArray[np.intp]


def findings(time: Floats, line: Lines, jumps: Rows, breaks: tuple[int, ...] = ()) -> list[Finding]:
    """gap and irregular-sampling, with figures and places.

    time     (n,), s, strictly increasing
    line     (n,) file lines
    jumps    rows before which there is a gap
    breaks   rows before which the clock was set
    """
    found = []
    if len(jumps):
        steps = time[jumps] - time[jumps - 1]
        largest = int(np.argmax(steps))
        at = int(jumps[largest])
        found.append(
            Finding(
                "gap",
                "warning",
                f"The record has {len(jumps)} gap{'s' * (len(jumps) > 1)}, the largest of {steps[largest]:.6g} s "
                f"before line {line[at]} "
                f"({time[at]:.6g} s from the start); nothing is fitted across them.",
                {
                    "count": len(jumps),
                    "largest_s": float(steps[largest]),
                    "at_s": float(time[at]),
                    "line": int(line[at]),
                },
            )
        )
    pieces = np.split(time, np.union1d(jumps, np.array(breaks, dtype=np.intp)))
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
