"""The largest setpoint step of a log, or the speed that its largest command step would ask for."""

from __future__ import annotations

import numpy as np

from ident.record import LoopRecord
from ident.tune.limited import Move

BEFORE = 10  # rows whose command is called where it rests


def largest_move(record: LoopRecord, gain: float, limits: tuple[float | None, float | None]) -> Move | None:
    """The move with the room that the command had before it; None without limits or without a move.

    gain  of the plant, for a log without setpoint
    """
    if limits == (None, None):
        return None
    by_setpoint = record.setpoint is not None and not np.isnan(record.setpoint).any()
    series = record.setpoint if by_setpoint and record.setpoint is not None else record.command
    steps = np.nan_to_num(np.diff(series))
    row = int(np.argmax(np.abs(steps)))
    if steps[row] == 0.0:
        return None
    rest = float(np.nanmedian(record.command[max(row + 1 - BEFORE, 0) : row + 1]))
    low, high = limits
    return Move(
        float(steps[row]) * (1.0 if by_setpoint else gain),
        min(low - rest, 0.0) if low is not None else -np.inf,
        max(high - rest, 0.0) if high is not None else np.inf,
    )
