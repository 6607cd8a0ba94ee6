"""Advice: the next test to run where a log is too poor, its size and length from the information it would bring.

The same information matrix that judges a log judges a test not yet made: two levels of the command in manual, the plant
and the noise as this log suggests them. Widths fall as one over the size of the step, and as one over the root of the
repetitions.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ident.estimate import Fit
from ident.estimate.columns import columns
from ident.estimate.layout import lay_out
from ident.evidence.colour import coloured_covariance
from ident.evidence.estimates import NORMAL_95
from ident.judge.excitation import speed_noise
from ident.record import LoopRecord

WANTED = {"K": 0.1, "T": 0.2, "L": 0.2}  # half-widths of 95 % intervals; L over T + L
SETTLED = 4.0  # time constants to hold a level: 98 % of the way
FEWEST, MOST = 2, 12  # repetitions
QUIET = 20  # rows before the first move
ROOM = 0.8  # share of the way to a command limit that a test may take
MOST_ROWS = 20_000  # of a test laid out to judge it; a longer one is not advised


@dataclass(frozen=True, slots=True)
class Advice:
    """The next test to run where the log is too poor, in the log's units.

    size, hold_s, repetitions   of the command's step with its sign, s at each level, how often; None where the log
                                does not even suggest a plant
    widths                      half-widths of 95 % intervals to expect: of K and T over themselves, of L over T + L
    assumed                     the plant that this rests on: suggested by the log, not to be tuned from
    """

    message: str
    size: float | None = None
    hold_s: float | None = None
    repetitions: int | None = None
    widths: dict[str, float] | None = None
    assumed: dict[str, float] | None = None


def advice(
    record: LoopRecord, guess: Fit | None = None, command_limits: tuple[float | None, float | None] = (None, None)
) -> Advice:
    """What to log next, where a record could not carry a model.

    guess            the fit that the log suggests although it is not to be believed
    command_limits   (low, high) of the command, where known
    """
    designed = _designed(record, guess, command_limits) if guess is not None else None
    return designed if designed is not None else _plain(record)


def _designed(record: LoopRecord, guess: Fit, limits: tuple[float | None, float | None]) -> Advice | None:
    if guess.spread is None or guess.noise is None:
        return None
    K, T, L = guess.model.static_gain, guess.spread.shape.lags, guess.model.dead_time
    h = record.sample_time or float(np.median(np.diff(record.time)))
    hold = float(f"{SETTLED * T + L:.2g}")
    if 2.0 * FEWEST * hold / h > MOST_ROWS or hold < 8.0 * h:
        return None
    needed = max(_widths_over(guess, hold, FEWEST, h).values())
    room = _room(record, limits)
    size, repetitions = _within(float(f"{needed:.2g}"), room), FEWEST
    if room is not None and needed > abs(room):
        repetitions = math.ceil(FEWEST * (needed / size) ** 2)
    repetitions = min(repetitions, MOST, int(MOST_ROWS * h / (2.0 * hold)))
    over = _widths_over(guess, hold, repetitions, h)
    widths = {name: width * WANTED[name] / abs(size) for name, width in over.items()}
    u, now = record.command_unit or "command units", _middle(record)
    told = ", ".join(f"{name} to ±{100.0 * width:.0f} %" for name, width in widths.items())
    bounded = "" if room is not None else " Its size is not held against the command's limits, as none were given."
    return Advice(
        "Log a test in manual, with the machine clear and allowed to change speed: bring the command to about "
        f"{now:.4g} {u}, wait until the speed has settled, move it to {now + size:.4g} {u}, hold for {hold:g} s, move "
        f"it back, hold again for {hold:g} s; {repetitions} times.{bounded} Log command, speed and setpoint every "
        f"{h:.3g} s or faster, from {QUIET} rows before the first move. If the motor is what this log suggests (K "
        f"{K:.3g}, T {T:.3g} s, L {L:.3g} s: not to be tuned from), that tells {told} (L of T + L). Smaller steps tell "
        "less, in proportion.",
        size,
        hold,
        repetitions,
        widths,
        {"K": K, "T": T, "L": L},
    )


def _widths_over(guess: Fit, hold: float, repetitions: int, h: float) -> dict[str, float]:
    """Half-widths over the wanted ones, of a test with steps of one command unit."""
    assert guess.spread is not None
    assert guess.noise is not None
    rows = max(round(hold / h), 1)
    u = np.zeros(QUIET + 2 * rows * repetitions)
    for up in range(QUIET, len(u), 2 * rows):
        u[up : up + rows] = 1.0
    time = np.asarray(h * np.arange(len(u)), dtype=np.float64)
    test = LoopRecord(time, u, np.cos(time))
    L, shape, K = guess.model.dead_time, guess.spread.shape, guess.model.static_gain
    own = columns(lay_out(test), shape, L)
    slopes = np.vstack((K * own.response, K * own.slopes, K * own.slope_L, own.nuisance))
    std = np.sqrt(np.maximum(np.diag(coloured_covariance(slopes, guess.noise)), 0.0))
    widths = {"K": std[0], "T": std[1], "L": std[1 + len(own.slopes)] / (shape.lags + L)}
    return {name: float(NORMAL_95 * width / WANTED[name]) for name, width in widths.items()}


def _room(record: LoopRecord, limits: tuple[float | None, float | None]) -> float | None:
    """How far the command may step from the log's middle, with its sign: the wider way. None without limits."""
    now = _middle(record)
    low, high = limits
    down = [ROOM * (low - now)] if low is not None and low < now else []
    up = [ROOM * (high - now)] if high is not None and high > now else []
    return max(down + up, key=abs, default=None)


def _within(needed: float, room: float | None) -> float:
    """The step that is needed, the way there is room for and no further."""
    return needed if room is None else math.copysign(min(needed, abs(room)), room)


def _middle(record: LoopRecord) -> float:
    return float(np.median(np.concatenate([record.command[s.slice] for s in record.segments])))


def _plain(record: LoopRecord) -> Advice:
    u, y = record.command_unit or "command units", record.speed_unit or "speed units"
    noise = speed_noise(record)
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
