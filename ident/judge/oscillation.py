"""Oscillation: does the loop swing by itself, and with what period?

Zero crossings of the error's autocorrelation come at even intervals where an oscillation goes on, however noisy the
error is (Thornhill, Huang and Zhang 2003, J. Process Control 13, 91-100). About ten intervals are looked at, the first
left out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import fft

from ident.findings import Finding
from ident.record import LoopRecord
from ident.record.segments import Floats

CROSSINGS = 11
REGULAR = 1.0
PER_MOVE = 6  # crossings for each move of the setpoint, from which the swing is the loop's own
STRONG = 0.3  # autocorrelation that the swings must still have at the last crossing looked at


@dataclass(frozen=True, slots=True)
class Swing:
    """period  in rows;  regularity  Tp over three of its standard deviations: above 1 it is one oscillation."""

    period: float
    regularity: float


def swing(series: Floats) -> Swing | None:
    """The regularity of a series' zero crossings, (n,); None where its autocorrelation crosses zero too seldom."""
    e = series - series.mean()
    n = len(e)
    size = fft.next_fast_len(2 * n, real=True)
    spectrum = fft.rfft(e, size)
    r = np.asarray(fft.irfft(spectrum * np.conj(spectrum), size)[: n // 2], dtype=np.float64)
    if not r.size or r[0] <= 0.0:
        return None
    at = np.flatnonzero(np.diff(np.signbit(r)))[:CROSSINGS]
    if len(at) < CROSSINGS:
        return None
    crossings = at + r[at] / (r[at] - r[at + 1])
    intervals = np.diff(crossings)
    period, spread = 2.0 * float(intervals.mean()), 2.0 * float(intervals.std(ddof=1))
    return Swing(period, period / (3.0 * max(spread, 1e-12)))


def sustained(record: LoopRecord) -> tuple[Finding, ...]:
    """A finding where a closed loop swings by itself: with its period and size. Needs a setpoint and an even log."""
    if record.setpoint is None or np.isnan(record.setpoint).any():
        return ()
    longest = max(record.segments, key=lambda s: s.rows, default=None)
    if longest is None or longest.step is None or longest.rows < 4 * CROSSINGS:
        return ()
    error = record.setpoint[longest.slice] - record.speed[longest.slice]
    found = swing(error)
    if found is None or found.regularity <= REGULAR:
        return ()
    moves = int(np.count_nonzero(np.diff(record.setpoint[longest.slice])))
    period = found.period * longest.step
    swings = 2.0 * longest.rows / found.period
    lag = round(found.period * (CROSSINGS // 2))
    e = error - error.mean()
    if swings < PER_MOVE * moves or not 0 < lag < len(e) or _alike(e[lag:], e[:-lag]) < STRONG:
        return ()
    amplitude = float(np.sqrt(2.0) * e.std())
    return (
        Finding(
            "sustained-oscillation",
            "warning",
            f"The speed swings about its setpoint by itself, with a period of {period:.3g} s and about "
            f"±{amplitude:.3g} {record.speed_unit or 'speed units'}. A gain too high for the loop, dry friction, play "
            "or another loop may be behind it; calm it before a test is made.",
            {"period_s": period, "amplitude": amplitude, "regularity": found.regularity},
        ),
    )


def _alike(one: Floats, other: Floats) -> float:
    return float(one @ other) / max(float(np.linalg.norm(one) * np.linalg.norm(other)), 1e-300)
