"""Excitation: does the log move enough to learn from, and what to log where it does not?"""

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


@dataclass(frozen=True, slots=True)
class Advice:
    """The next test to run where the log is too poor, in the log's units."""

    message: str


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


def advice(record: LoopRecord) -> Advice:
    """What to log next, where a record could not carry a model."""
    u, y = record.command_unit or "command units", record.speed_unit or "speed units"
    noise = _noise(record)
    size = (
        f"a step of the command (in {u}) large enough to move the speed by at least {20.0 * noise:.3g} {y}, "
        "twenty times the noise seen here"
        if noise > 0
        else f"a step of the command (in {u}) that clearly moves the speed"
    )
    return Advice(
        "Log a test: with the loop in manual and the machine clear and allowed to change speed, wait until the speed "
        f"is settled, make {size}, wait until it has settled again, and step back. Keep command, speed and, "
        "where there is one, setpoint in the log, from some seconds before the first move."
    )


def _noise(record: LoopRecord) -> float:
    """Std of the speed's row-to-row noise, from first differences (robust: median)."""
    steps = [np.diff(record.speed[s.slice]) for s in record.segments if s.rows > 2]
    if not steps:
        return 0.0
    return float(np.median(np.abs(np.concatenate(steps)))) / 0.6745 / float(np.sqrt(2.0))
