"""Load moved: a loop that is thrown off a setpoint which nobody moved.

The loop's own noise about the setpoint is told by the middle of its size, which a few disturbances do not move.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ident.findings import Finding
from ident.judge.operation import Operated
from ident.record import LoopRecord
from ident.record.segments import Flags, spans

CLEAR = 6.0  # robust standard deviations of the error
NOTABLE = 0.05  # of the setpoint's size: less is no disturbance worth a word
LEAST = 5  # rows on end
TOGETHER = 0.02  # of the rows: closer excursions are one, a swing back across the setpoint included
MOST = 5  # of them: more are no single disturbances
PLACES = 3  # named in the finding


def load_moved(record: LoopRecord, operated: Sequence[Operated]) -> tuple[Finding, ...]:
    """A finding with the seconds, where a closed loop's setpoint stands still and the speed is thrown off it.

    operated  the record's spans by their operation: one at least is closed, none by hand

    Running up at the start does not count.
    """
    r = record.setpoint
    kinds = {o.operation for o in operated}
    if r is None or "closed-loop" not in kinds or "open-loop" in kinds:
        return ()
    if np.isnan(r).any() or float(np.ptp(r)) > 0.0:
        return ()
    error = r - record.speed
    known = np.isfinite(error)
    if not known.any():
        return ()
    middle = float(np.median(error[known]))
    std = 1.4826 * float(np.median(np.abs(error[known] - middle)))
    off = np.abs(error - middle)
    thrown = _runs(known & (off > max(CLEAR * std, NOTABLE * abs(float(r[0])))), round(TOGETHER * record.rows))
    thrown = [(a, b) for a, b in thrown if a > LEAST]
    if std == 0.0 or not 1 <= len(thrown) <= MOST:
        return ()
    places = ", ".join(f"{record.time[a]:.4g} to {record.time[b - 1]:.4g} s" for a, b in thrown[:PLACES])
    largest = max(float(np.nanmax(off[a:b])) for a, b in thrown)
    return (
        Finding(
            "load-moved",
            "warning",
            f"From {places} the speed is thrown off its setpoint by up to {largest:.3g} "
            f"{record.speed_unit or 'speed units'}, though nobody moved that: the load moved. Such a log tells how the "
            "loop rejects a load, not what the motor does with its command.",
            {"count": len(thrown), "from_s": float(record.time[thrown[0][0]]), "largest": largest},
        ),
    )


def _runs(flags: Flags, together: int) -> list[tuple[int, int]]:
    """Runs of at least LEAST flagged rows, those less than `together` rows apart as one."""
    out: list[tuple[int, int]] = []
    for start, stop in spans(flags).tolist():
        if stop - start < LEAST:
            continue
        if out and start - out[-1][1] < together:
            out[-1] = (out[-1][0], stop)
        else:
            out.append((start, stop))
    return out
