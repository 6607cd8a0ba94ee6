"""By hand: the rows in which nobody closes the loop, by the logged mode or by a command that stands still.

A controller moves its command in most of its periods. Rows in which the command stands for many of them, and the single
moves between such stands, are a hand's (or a limit's: there the loop is open as well).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ident.record import LoopRecord
from ident.record.segments import Flags, Floats, spans

SELDOM = 0.2  # share of periods with a move, below which nobody closes a loop with the command
PERIODS, ROWS = 10, 15  # a stand lasts this many typical intervals and so many rows on top
MOST_HELD = 100  # rows of one controller period
ON_PHASE = 0.97  # share of the moves that fall on one row in n, where a controller holds its command for n rows
MOVES = 10  # fewer say nothing of a controller


def hand_rows(record: LoopRecord) -> Flags:
    """(rows,): True where the command is set by hand or stands at a limit; rows outside the segments are False."""
    by_hand = np.zeros(record.rows, dtype=np.bool_)
    if record.modes:
        for span in record.modes:
            by_hand[span.start : span.stop] = span.mode == "manual"
        return by_hand
    usual = _usual_gap(record)
    for s in record.segments:
        by_hand[s.slice] = _stands(record.command[s.slice], PERIODS * usual + ROWS, usual)
    return by_hand


def automatic(record: LoopRecord) -> list[tuple[Floats, Floats, Floats | None]]:
    """(command, speed, setpoint) of the runs that are not by hand, one row per period of the controller."""
    by_hand = hand_rows(record)
    found = [s.start + spans(~by_hand[s.slice]) for s in record.segments]
    return [controlled(record, start, stop) for edges in found for start, stop in edges.tolist()]


def controlled(record: LoopRecord, start: int, stop: int) -> tuple[Floats, Floats, Floats | None]:
    """(command, speed, setpoint) of rows start..stop-1, one per period; the setpoint None where it is not known."""
    n, phase = held_rows(record.command[start:stop])
    rows = slice(start + phase, stop, n)
    setpoint = None if record.setpoint is None else record.setpoint[rows]
    if setpoint is not None and np.isnan(setpoint).any():
        setpoint = None
    return record.command[rows], record.speed[rows], setpoint


def held_rows(command: Floats) -> tuple[int, int]:
    """(n, phase): the command moves only every n-th row, from row `phase`; (1, 0) where it moves freely.

    command  (m,), of one unbroken run under one controller
    """
    moved = np.flatnonzero(np.diff(command)) + 1
    if len(moved) < MOVES or len(moved) > 0.6 * len(command):
        return 1, 0
    for n in _common_steps(np.diff(moved), min(MOST_HELD, len(command) // MOVES)):
        counts = np.bincount(moved % n, minlength=n)
        phase = int(np.argmax(counts))
        slots = (moved[-1] - moved[0]) // n + 1
        if counts[phase] >= ON_PHASE * len(moved) and counts[phase] >= 0.5 * slots:
            return n, phase
    return 1, 0


def _common_steps(gaps: NDArray[np.int64], most: int) -> list[int]:
    """The n of most..2, the largest first, that divide as many gaps as they must for ON_PHASE of the moves."""
    # A move off phase spoils two gaps at most.
    needed = len(gaps) - 2.0 * (1.0 - ON_PHASE) * (len(gaps) + 1)
    count = np.bincount(gaps)
    length, steps = np.flatnonzero(count), np.arange(most, 1, -1)
    divided = (length % steps[:, None] == 0) @ count[length]
    return [int(n) for n in steps[divided >= needed]]


def _usual_gap(record: LoopRecord) -> int:
    """Rows from one move of the command to the next, in the parts where it moves often."""
    gaps = [np.diff(np.flatnonzero(np.diff(record.command[s.slice]))) for s in record.segments]
    every = np.concatenate(gaps) if gaps else np.zeros(0)
    often = every[every <= MOST_HELD]
    return max(int(np.median(often)), 1) if len(often) >= MOVES else 1


def _stands(command: Floats, least: int, usual: int) -> Flags:
    """The stands of `least` rows or more, with what lies between them where that is no controller's."""
    moved = np.concatenate(([False], np.diff(command) != 0.0))
    lengths = np.diff(np.concatenate(([0], np.flatnonzero(moved), [len(command)])))
    out = np.repeat(lengths >= least, lengths)
    for start, stop in spans(~out).tolist():
        moves = int(np.count_nonzero(moved[start:stop]))
        if moves < MOVES or moves * usual < SELDOM * (stop - start):
            out[start:stop] = True
    return out
