"""Excitation: does the log move enough to learn from?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.errors import NotIdentifiable
from ident.record import LoopRecord

CLEAR_MOVE = 0.1  # of the command's span: a change from row to row that counts as a move


@dataclass(frozen=True, slots=True)
class Excitation:
    """Does the log move enough to learn from?

    command_span, speed_span   largest less smallest value over the used rows, in their units
    command_moves              changes of the command from one row to the next of a tenth of its span or more
    reason                     one sentence
    """

    sufficient: bool
    command_span: float
    speed_span: float
    command_moves: int
    reason: str


def excitation(record: LoopRecord, refused: NotIdentifiable | None) -> Excitation:
    """The verdict on a record, `refused` being why no model came out of it (None: one did)."""
    spans = [
        float(np.ptp(np.concatenate([values[s.slice] for s in record.segments]))) if record.segments else 0.0
        for values in (record.command, record.speed)
    ]
    moves = sum(
        int(np.count_nonzero(np.abs(np.diff(record.command[s.slice])) >= CLEAR_MOVE * spans[0])) if spans[0] > 0 else 0
        for s in record.segments
    )
    reason = refused.message if refused else "The command moves and the speed answers by more than its noise."
    return Excitation(refused is None, spans[0], spans[1], moves, reason)


def speed_noise(record: LoopRecord) -> float:
    """Std of the speed's row-to-row noise, from first differences (robust: median)."""
    steps = [np.diff(record.speed[s.slice]) for s in record.segments if s.rows > 2]
    if not steps:
        return 0.0
    return float(np.median(np.abs(np.concatenate(steps)))) / 0.6745 / float(np.sqrt(2.0))
