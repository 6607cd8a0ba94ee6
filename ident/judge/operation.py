"""Operation: was the loop closed while this was logged? The data say so, where they can."""

from __future__ import annotations

from typing import Literal

import numpy as np

from ident.record import LoopRecord
from ident.record.segments import Floats

Operation = Literal["open-loop", "closed-loop", "unknown"]

SELDOM = 0.2  # share of rows with a move of the command, below which nobody closes a loop with it
ANSWERS = 0.5  # share of the command's moves that error and its change explain under feedback


def operation(record: LoopRecord) -> Operation:
    """From the command's own movement and its answer to the error r - y.

    A command that stands still in most rows while the speed does not is set by hand. One that moves in most rows
    and whose moves follow the error and its change (as any PI or PID makes them) comes from a controller.
    """
    moves = np.concatenate([np.diff(record.command[s.slice]) for s in record.segments])
    speeds = np.concatenate([np.diff(record.speed[s.slice]) for s in record.segments])
    moving, alive = float(np.mean(moves != 0.0)), float(np.mean(speeds != 0.0))
    if moving <= SELDOM and alive > SELDOM:
        return "open-loop"
    if record.setpoint is None or np.isnan(record.setpoint).any():
        return "unknown"
    return "closed-loop" if _answer(record, record.setpoint) >= ANSWERS else "unknown"


def _answer(record: LoopRecord, setpoint: Floats) -> float:
    """Share of the command's moves explained by e[k], e[k-1] and e[k-2] (a PID's difference equation)."""
    rows, moves = [], []
    for s in record.segments:
        if s.rows < 4:
            continue
        e = setpoint[s.slice] - record.speed[s.slice]
        rows.append(np.column_stack((e[2:], e[1:-1], e[:-2])))
        moves.append(np.diff(record.command[s.slice])[1:])
    if not rows:
        return 0.0
    X, y = np.vstack(rows), np.concatenate(moves)
    power = float(y @ y)
    if power == 0.0:
        return 0.0
    # Under feedback the command of a row follows from this row's error or, in controllers that answer one period
    # later, from the one before: three errors cover both.
    rest = y - X @ np.linalg.lstsq(X, y, rcond=None)[0]
    return 1.0 - float(rest @ rest) / power
