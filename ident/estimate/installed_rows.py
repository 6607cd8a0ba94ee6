"""Answers: the rows in which a controller's difference equation can be read, at the controller's own instants."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.estimate.by_hand import held_rows
from ident.record import LoopRecord
from ident.record.segments import Flags, Floats, spans

LATEST = 3  # rows from a speed to the command that answers to it, at most
SHORTEST = 12  # instants; a shorter span says little of a controller
GRAIN = 1e-10  # of the command: closer values differ by the rounding of decimals only
ON_GRID = 0.99  # share of the values


@dataclass(frozen=True, slots=True, eq=False)
class Answers:
    """One span under one controller; instants are the rows in which it may move the command.

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
    """Spans of a record with a setpoint, outside `by_hand`, where command and error are known and off the limits."""
    if record.setpoint is None:
        return ()
    known = ~np.isnan(record.setpoint) & ~by_hand
    parts = [(s.start + a, s.start + b, s.step) for s in record.segments for a, b in spans(known[s.slice]).tolist()]
    # A limit may be touched for a single row. Rows at the extremes cost nothing where they are no limit.
    every = np.concatenate([record.command[a:b] for a, b, _ in parts]) if parts else np.zeros(1)
    limits = (float(every.min()), float(every.max()))
    found = [_span(record, a, b, step, limits) for a, b, step in parts if b - a >= SHORTEST]
    return tuple(f for f in found if np.count_nonzero(f.usable) >= SHORTEST)


def _span(record: LoopRecord, start: int, stop: int, step: float | None, limits: tuple[float, float]) -> Answers:
    assert record.setpoint is not None
    n, phase = held_rows(record.command[start:stop])
    rows = np.arange(start + phase, stop, n)
    command = record.command[rows]
    free = ~np.isin(command, limits)
    usable = free.copy()
    usable[1:] &= free[:-1]
    # Second differences, LATEST rows back, must lie within the span.
    usable[: 2 + -(-LATEST // n)] = False
    back = np.maximum(rows[None, :] - np.arange(1 + LATEST)[:, None], start)
    period = n * (step or float(np.median(np.diff(record.time[start:stop]))))
    # Rounded stamps of an even clock would only add noise to the integral.
    time = (
        np.asarray(period * np.arange(len(rows)), dtype=np.float64)
        if step is not None
        else record.time[rows] - record.time[rows[0]]
    )
    return Answers(time, command, record.speed[back], record.setpoint[back], usable, period, n)


def quantum(spans_: tuple[Answers, ...]) -> float:
    """The step of the grid on which the command is written down; 0 where the values show none."""
    values = np.unique(np.concatenate([a.command for a in spans_]))
    between = np.diff(values)
    between = between[between > GRAIN * float(np.abs(values).max())]
    if len(between) == 0:
        return 0.0
    smallest = float(between.min())
    places = (values - values[0]) / smallest
    off = np.abs(places - np.round(places))
    return smallest if float(np.mean(off < 0.01)) > ON_GRID else 0.0
