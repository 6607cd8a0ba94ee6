"""Encoder counts to speed: 60 times the wrapped difference over counts per revolution and time, rpm."""

from __future__ import annotations

import numpy as np

from ident.errors import ReadError
from ident.findings import Finding
from ident.record.quote import counted, printable, quoted
from ident.record.segments import Floats, gaps, spans

UNIT = "rpm"
_BITS = (16, 24, 32)
_NEAR_FULL = 0.9  # of the range: a counter that starts anew each revolution comes this near its end


def speed_from_counts(
    counts: Floats, time: Floats, breaks: tuple[int, ...], counts_per_rev: float, name: str
) -> tuple[Floats, Finding]:
    """Speed over the interval before each row; NaN in the first row and after each gap, where none is known.

    counts           (n,), position; NaN where missing
    time             (n,), s, strictly increasing
    breaks           rows before which the clock was set
    counts_per_rev   of the encoder as it is counted (with all edges that are)

    Returns (n,) rpm, and the resolution as a finding.
    Raises ReadError: not-counts.
    """
    known = counts[np.isfinite(counts)]
    if (known % 1 != 0).any():
        raise ReadError(
            "not-counts",
            f"Column {quoted(name)} holds fractions, so it is no encoder position: leave out the option "
            '"counts_per_rev" if the column is a speed.',
            {"column": printable(name)},
        )
    modulus = _modulus(known, counts_per_rev)
    step = np.diff(time)
    moved = np.diff(counts)
    wrapped = (moved + modulus / 2) % modulus - modulus / 2
    rollovers = int(np.count_nonzero(np.abs(moved) > modulus / 2))
    speed = np.concatenate(([np.nan], 60.0 * wrapped / (counts_per_rev * step)))
    speed[gaps(time)] = np.nan
    speed[list(breaks)] = np.nan
    typical = float(np.median(step))
    quantum = 60.0 / (counts_per_rev * typical)
    lost = len(spans(np.isnan(speed)))
    message = (
        f"Speed was computed from encoder counts ({counts_per_rev:g} per revolution, rolling over at {modulus:.0f}, "
        f"{counted(rollovers, 'time', 'times')}): one count is {quantum:.4g} rpm, and each value is the mean over "
        f"the {typical:.4g} s before its row, which looks like half of that as dead time."
    )
    return speed, Finding(
        "encoder-counts",
        "info",
        message,
        {
            "counts_per_rev": float(counts_per_rev),
            "modulus": float(modulus),
            "rollovers": rollovers,
            "quantum_rpm": quantum,
            "interval_s": typical,
            "spans_without_speed": lost,
        },
    )


def _modulus(known: Floats, counts_per_rev: float) -> float:
    """Where the counter starts anew: each revolution if it jumps back by one, else at 16, 24 or 32 bits."""
    span = float(np.ptp(known)) + 1
    jumps = np.abs(np.diff(known))
    if _NEAR_FULL * counts_per_rev <= span <= counts_per_rev and jumps.max(initial=0) > counts_per_rev / 2:
        return counts_per_rev
    return float(next((2**bits for bits in _BITS if span <= 2**bits), 2 ** _BITS[-1]))
