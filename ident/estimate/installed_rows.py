"""Answers: the rows in which a controller's difference equation can be read, at the controller's own instants."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.estimate.by_hand import held_rows
from ident.record import LoopRecord
from ident.record.segments import Flags, Floats, spans

LATEST = 3  # rows from a speed to the command that answers to it, at most
SETTLING = 30  # instants at the start of a part that a filter may need to forget what came before
SHORTEST = 12  # instants; a shorter span says little of a controller
GRAIN = 1e-10  # of the command: closer values differ by the rounding of decimals only
ON_GRID = 0.99  # share of the values


@dataclass(frozen=True, slots=True, eq=False)
class Answers:
    """One part of a log under one controller; instants are the rows in which it may move the command.

    time, command, setpoint   (m,) at the instants
    speeds                    (1 + LATEST, m): speed 0, 1, ... rows before each instant
    setpoints                 (1 + LATEST, m)
    usable                    (m,): the step of the command to this instant follows the controller's law
    step                      s, period of the controller
    held                      rows of the log in one period
    """

    time: Floats
    command: Floats
    speeds: Floats
    setpoints: Floats
    usable: Flags
    step: float
    held: int


def answers(record: LoopRecord, by_hand: Flags) -> tuple[Answers, ...]:
    """The parts of a record with a known setpoint; usable outside `by_hand` and off the command's limits.

    A part goes on through rows by hand or at a limit, as filters of the speed do.
    """
    if record.setpoint is None:
        return ()
    known = ~np.isnan(record.setpoint)
    parts = [
        (s.start + a, s.start + b, s.step)
        for s in record.segments
        for a, b in spans(known[s.slice]).tolist()
        if np.count_nonzero(~by_hand[s.start + a : s.start + b]) >= SHORTEST
    ]
    # A limit may be touched for a single row. Rows at the extremes cost nothing where they are no limit.
    every = np.concatenate([record.command[a:b][~by_hand[a:b]] for a, b, _ in parts]) if parts else np.zeros(1)
    limits = (float(every.min()), float(every.max()))
    found = [_part(record, by_hand, a, b, step, limits) for a, b, step in parts]
    return tuple(f for f in found if np.count_nonzero(f.usable) >= SHORTEST)


def _part(
    record: LoopRecord, by_hand: Flags, start: int, stop: int, step: float | None, limits: tuple[float, float]
) -> Answers:
    assert record.setpoint is not None
    longest = max(spans(~by_hand[start:stop]).tolist(), key=lambda run: int(run[1] - run[0]))
    n, phase = held_rows(record.command[start + longest[0] : start + longest[1]])
    rows = np.arange(start + (longest[0] + phase) % n, stop, n)
    command = record.command[rows]
    free = ~np.isin(command, limits) & ~by_hand[rows]
    usable = free.copy()
    usable[1:] &= free[:-1]
    # Second differences, LATEST rows back, must lie within the part; filters start from an unknown state.
    usable[: max(2 + -(-LATEST // n), min(SETTLING, len(rows) // 10))] = False
    back = np.maximum(rows[None, :] - np.arange(1 + LATEST)[:, None], start)
    period = n * (step or float(np.median(np.diff(record.time[start:stop]))))
    # Rounded stamps of an even clock would only add noise to the integral.
    even = step is not None
    time = np.asarray(period * np.arange(len(rows)) if even else record.time[rows] - record.time[rows[0]])
    return Answers(time, command, record.speed[back], record.setpoint[back], usable, period, n)


def quantum(spans_: tuple[Answers, ...]) -> float:
    """The step of the grid on which the command is written down; 0 where the values show none."""
    values = np.unique(np.concatenate([a.command[a.usable] for a in spans_]))
    between = np.diff(values)
    between = between[between > GRAIN * float(np.abs(values).max())]
    if len(between) == 0:
        return 0.0
    smallest = float(between.min())
    places = (values - values[0]) / smallest
    off = np.abs(places - np.round(places))
    return smallest if float(np.mean(off < 0.01)) > ON_GRID else 0.0
