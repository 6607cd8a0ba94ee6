"""The law's columns: what each part of a PID adds to the command from one instant to the next.

With s the trapezoid of the error, h (e[k] + e[k-1])/2, the command moves by

    du = ki s + Kp (b dr - dy) + kd (c d2r - d2y)/h,    ki = Kp/Ti, kd = Kp Td

for any rule of integration and any setpoint weights b and c. Summed up again within each run of usable rows, with an
integral of its own per run, the same columns give the command itself: better where the command is written down in
coarse steps, as its rounding does not add up.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Literal

import numpy as np
from scipy.signal import lfilter

from ident.estimate.installed_rows import Answers
from ident.loop.law import FilterOn
from ident.record.segments import Floats

Shaping = Literal["none", "lag", "ramp"]
S, R, Y, DR, DY = range(5)
# Which of the five columns each parameter moves: ki, Kp, Kp b, kd.
FORMS: dict[str, tuple[tuple[int, ...], ...]] = {
    "PI": ((S,), (R, Y)),
    "PI, weighted": ((S,), (Y,), (R,)),
    "PID": ((S,), (R, Y), (), (DR, DY)),
    "PI-D": ((S,), (R, Y), (), (DY,)),
    "PID, weighted": ((S,), (Y,), (R,), (DR, DY)),
    "PI-D, weighted": ((S,), (Y,), (R,), (DY,)),
}


@dataclass(frozen=True, slots=True)
class Structure:
    """Everything of a law but its gains.

    late       rows of the log from the speed to the answer
    counted    the integral counts rows, not seconds (logs with uneven steps)
    filter_on, pole      as in ControlLaw, pole = Tf/(Tf + h); of first order x_f[k] = pole x_f[k-1] + (1 - pole) x[k]
    shaping, shape       of the setpoint: lag, s, or ramp, speed unit per s
    """

    late: int = 0
    counted: bool = False
    filter_on: FilterOn = "none"
    pole: float = 0.0
    shaping: Shaping = "none"
    shape: float = 0.0


@dataclass(frozen=True, slots=True, eq=False)
class Moves:
    """columns (5, n) and the command's moves (n,), in runs of consecutive instants of these lengths."""

    columns: Floats
    command: Floats
    lengths: tuple[int, ...]

    @property
    def runs(self) -> tuple[int, ...]:
        """Commands in each run: one more than its moves."""
        return tuple(n + 1 for n in self.lengths)

    def summed(self) -> Moves:
        """Columns and command themselves, each run less its mean: n + runs values."""
        stacked = np.vstack((self.columns, self.command))
        place = np.arange(stacked.shape[1]) + np.repeat(np.arange(1, len(self.lengths) + 1), self.lengths)
        out = np.zeros((6, stacked.shape[1] + len(self.lengths)))
        out[:, place] = stacked
        out = self.levelled(np.cumsum(out, axis=1))
        return replace(self, columns=out[:5], command=out[5])

    def levelled(self, values: Floats) -> Floats:
        """Values (..., n + runs) less the mean of each run."""
        mean = np.add.reduceat(values, np.cumsum([0, *self.runs[:-1]]), axis=-1) / np.array(self.runs)
        return np.asarray(values - np.repeat(mean, self.runs, axis=-1))


def moves(spans: tuple[Answers, ...], structure: Structure) -> Moves:
    """The columns of a structure over all spans."""
    columns, command, lengths = [], [], []
    for span in spans:
        column = _columns(span, structure)
        use = span.usable
        edges = np.flatnonzero(np.diff(np.concatenate(([False], use, [False])).astype(np.int8))).reshape(-1, 2)
        columns.append(column[:, use])
        command.append(np.diff(span.command, prepend=span.command[0])[use])
        lengths += (edges[:, 1] - edges[:, 0]).tolist()
    return Moves(np.hstack(columns), np.concatenate(command), tuple(lengths))


def _columns(span: Answers, structure: Structure) -> Floats:
    y, r, p = span.speeds[structure.late], span.setpoints[structure.late], structure.pole
    step = np.diff(span.time, prepend=span.time[0] - span.step)
    if structure.counted:
        step = np.full(len(step), span.step)
    r = shaped(r, span.time, span.step, structure)
    if structure.filter_on == "speed":
        y = lfilter([1.0 - p], [1.0, -p], y, zi=[p * y[0]])[0]
    elif structure.filter_on == "speed, second order":
        n = p / (1.0 - p)  # Tf/h
        y = y[0] + lfilter([1.0], [1.0 + n + n * n / 2.0, -n - n * n, n * n / 2.0], y - y[0])
    out = np.zeros((5, len(y)))
    e = r - y
    out[S, 1:] = (e[1:] + e[:-1]) / 2.0 * step[1:]
    out[R, 1:], out[Y, 1:] = np.diff(r), -np.diff(y)
    for slope, move in ((DR, R), (DY, Y)):
        rate = out[move] / step
        out[slope, 1:] = np.diff(rate)
    if structure.filter_on == "derivative":
        out[DR:] = lfilter([1.0 - p], [1.0, -p], out[DR:], axis=1)
    return out


def shaped(setpoint: Floats, time: Floats, step: float, structure: Structure) -> Floats:
    """What the controller sees of a logged setpoint, (m,)."""
    if structure.shaping == "lag":
        p = structure.shape / (structure.shape + step)
        return np.asarray(lfilter([1.0 - p], [1.0, -p], setpoint, zi=[p * setpoint[0]])[0])
    if structure.shaping == "ramp":
        return _ramped(setpoint, time, step, structure.shape)
    return setpoint


def _ramped(setpoint: Floats, time: Floats, step: float, rate: float) -> Floats:
    """The setpoint followed at a limited rate; exact between its moves, so only those are walked through."""
    out = np.empty(len(setpoint))
    edges = [0, *(np.flatnonzero(np.diff(setpoint)) + 1).tolist(), len(setpoint)]
    level = float(setpoint[0])
    for start, stop in pairwise(edges):
        goal = float(setpoint[start])
        after = time[start:stop] - time[start] + step
        left = np.maximum(abs(goal - level) - rate * after, 0.0)
        out[start:stop] = goal - np.sign(goal - level) * left
        level = float(out[stop - 1])
    return out
