"""Operation: was the loop closed while this was logged, and in which spans? The data say so, where they can."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Literal

import numpy as np

from ident.estimate import Recovered
from ident.estimate.by_hand import controlled, hand_rows
from ident.evidence.feedback import feedback
from ident.findings import Finding
from ident.record import LoopRecord
from ident.record.segments import Floats

Operation = Literal["open-loop", "closed-loop", "unknown"]

ALIVE = 0.2  # share of rows with a move of the speed, below which a command that stands says nothing
TRACKS = 0.9  # share of a span's rows where the setpoint only follows the speed
STEPS = 1.5  # of the command's own grid that its law must ask for before a command that stands is a hand's
AT_LIMIT = 0.8  # share of a span's rows at the command's extreme, the error pushing on
COARSE = 3.0  # steps of the command's grid in half of a controller's moves, below which it may stand by itself
SHORTEST = 12  # rows; a shorter span belongs to its neighbour


@dataclass(frozen=True, slots=True)
class Operated:
    """Rows start..stop-1 under one kind of operation.

    because   mode: the log's own column; command: what the command does; limit: it stands at a limit of the controller
    """

    start: int
    stop: int
    operation: Operation
    because: str


def operations(record: LoopRecord, recovered: Recovered | None) -> tuple[Operated, ...]:
    """Spans of a record by their operation, in order; they cover its segments.

    By the logged mode where there is one. Else by the command: one that stands, or moves singly, while the speed lives
    is set by hand, unless the controller's own law (where it was recovered) hardly asks for a move there; one that
    moves often and answers to error or speed comes from a controller.
    """
    by_hand = hand_rows(record)
    busy = np.concatenate([record.command[s.slice][~by_hand[s.slice]] for s in record.segments] or [np.zeros(0)])
    found: list[Operated] = []
    for s in record.segments:
        edges = (np.flatnonzero(np.diff(by_hand[s.slice])) + 1 + s.start).tolist()
        spans = [
            Operated(start, stop, "open-loop" if by_hand[start] else "closed-loop", "mode")
            if record.modes
            else _standing(record, recovered, busy, start, stop)
            if by_hand[start]
            else _controlled(record, start, stop, known=recovered is not None)
            for start, stop in pairwise([s.start, *edges, s.stop])
        ]
        found += _merged(spans)
    return tuple(found)


def operation(spans: tuple[Operated, ...]) -> Operation:
    """Of the whole record: closed where any part of it is, open where all that can be told is."""
    kinds = {s.operation for s in spans}
    if "closed-loop" in kinds:
        return "closed-loop"
    return "open-loop" if "open-loop" in kinds else "unknown"


def mixed(record: LoopRecord, spans: tuple[Operated, ...]) -> tuple[Finding, ...]:
    """The finding of a record with both kinds in it: which seconds are which."""
    parts = {
        kind: [f"{record.time[s.start]:.4g} to {record.time[s.stop - 1]:.4g} s" for s in spans if s.operation == kind]
        for kind in ("open-loop", "closed-loop")
    }
    if not all(parts.values()):
        return ()
    return (
        Finding(
            "manual-and-automatic",
            "info",
            f"In manual: {', '.join(parts['open-loop'])}; in automatic: {', '.join(parts['closed-loop'])}. The plant "
            "was fitted to both together; the controller was read from the automatic part alone.",
            {
                f"{name}_s": float(
                    sum(record.time[s.stop - 1] - record.time[s.start] for s in spans if s.operation == kind)
                )
                for name, kind in (("manual", "open-loop"), ("automatic", "closed-loop"))
            },
        ),
    )


def _controlled(record: LoopRecord, start: int, stop: int, *, known: bool) -> Operated:
    """A span whose command moves often; known: the controller's law was recovered from it."""
    command, speed, setpoint = controlled(record, start, stop)
    answers = known or (setpoint is not None and feedback([command], [speed], [setpoint]))
    return Operated(start, stop, "closed-loop" if answers else "unknown", "command")


def _standing(record: LoopRecord, recovered: Recovered | None, busy: Floats, start: int, stop: int) -> Operated:
    """A span whose command stands or moves singly; busy: the commands of the other rows."""
    part = slice(start, stop)
    command, speed = record.command[part], record.speed[part]
    if float(np.mean(np.diff(speed) != 0.0)) <= ALIVE:
        return Operated(start, stop, "unknown", "command")
    by_hand = Operated(start, stop, "open-loop", "command")
    if len(busy) == 0 or record.setpoint is None:
        return by_hand
    e = record.setpoint[part] - speed
    if np.isnan(e).any() or float(np.mean(e == 0.0)) >= TRACKS:
        return by_hand
    usual, own = np.abs(np.diff(busy)), float(np.abs(np.diff(command)).max())
    usual = usual[usual > 0.0]
    if own > STEPS * float(np.quantile(usual, 0.9)):
        return by_hand  # no move of the controller is as large
    if recovered is not None:
        pushes = float(np.mean(e)) * recovered.settings.Kp
        at_limit = command >= busy.max() if pushes > 0.0 else command <= busy.min()
        if float(np.mean(at_limit)) >= AT_LIMIT:
            return Operated(start, stop, "closed-loop", "limit")
        asked = float(np.ptp(_asked(recovered, record.time[part], record.setpoint[part], speed)))
        if own == 0.0 and asked <= STEPS * recovered.step:
            return Operated(start, stop, "closed-loop", "command")
        if asked > STEPS * float(np.ptp(command)) and float(np.median(usual)) > COARSE * recovered.step:
            return by_hand
    # A command in coarse steps may stand because the controller cuts what it adds to whole steps.
    return Operated(start, stop, "unknown", "command")


def _asked(recovered: Recovered, time: Floats, setpoint: Floats, speed: Floats) -> Floats:
    """The command that a recovered PI would have given over a span, from 0; its derivative apart."""
    s = recovered.settings
    e = setpoint - speed
    integral = np.concatenate(([0.0], np.cumsum((e[1:] + e[:-1]) / 2.0 * np.diff(time))))
    return np.asarray(s.Kp * (s.b * setpoint - speed + integral / s.Ti), dtype=np.float64)


def _merged(spans: list[Operated]) -> list[Operated]:
    out: list[Operated] = []
    for span in spans:
        if out and (out[-1].operation == span.operation or span.stop - span.start < SHORTEST):
            out[-1] = replace(out[-1], stop=span.stop)
        elif len(out) == 1 and out[0].stop - out[0].start < SHORTEST:
            out[0] = replace(span, start=out[0].start)
        else:
            out.append(span)
    return out
