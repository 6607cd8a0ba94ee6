"""SecondOrder: the shape of a SOPDT's answer, 1/(P s^2 + S s + 1)."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.signal import lfilter

from ident.estimate.first_order import LONGEST_T, SHORTEST_T
from ident.estimate.layout import Layout, Stretch
from ident.estimate.shape import delayed
from ident.plants.second_hold import Taps, motion, pair_states, pair_taps
from ident.record.segments import Floats

SHORTEST_LAG = 0.1  # steps
NUDGE = 1e-6  # of a logarithm, for slopes: the answer is smooth in S and P, and slopes only steer and weigh


@dataclass(frozen=True, slots=True, eq=False)
class _Arrived:
    """The command as it has arrived after a dead time, on a uniform grid: the same for every shape.

    held     (used rows,), at the sample before the instant asked for, `since` s later
    moves    (rows,), from that sample to the next;  slope  (used rows,), per s, of a straight command, else None
    """

    step: float
    since: float
    skip: int
    held: Floats
    moves: Floats
    slope: Floats | None


def _arrived(stretch: Stretch, L: float) -> _Arrived:
    assert stretch.step is not None
    u, n, skip = stretch.command, stretch.rows, stretch.skip
    shift = min(int(L / stretch.step) + 1, n)
    held = np.concatenate((np.full(shift, u[0]), u[: n - shift]))
    moves = np.zeros(n)
    moves[shift : n - 1] = np.diff(u)[: n - 1 - shift] if shift < n - 1 else 0.0
    slope = None
    if stretch.straight:
        slope = np.concatenate((np.zeros(shift), stretch.rates[: n - shift]))[skip:]
    return _Arrived(stretch.step, (int(L / stretch.step) + 1) * stretch.step - L, skip, held[skip:], moves, slope)


@dataclass(frozen=True, slots=True)
class SecondOrder:
    """1/(P s^2 + S s + 1): S in s the sum, P in s^2 the product of the time constants, real or not.

    equal   the two lags are held equal, P = S^2/4, and S alone moves
    """

    S: float
    P: float
    equal: bool = False

    @property
    def lags(self) -> float:
        """Sum of the time constants, s."""
        return self.S

    @property
    def slowest(self) -> float:
        """A bound of the longest time constant, s: S for two lags, 2 P/S of the envelope of a ringing pair."""
        return max(self.S, 2.0 * self.P / self.S)

    def reach(self, layout: Layout) -> tuple[Floats, Floats]:
        """The least and most that one step may take of the logarithms, (k,) each, within what the layout can tell."""
        least = max(math.log(SHORTEST_T * layout.step / self.S), -1.0)
        most = min(math.log(LONGEST_T * layout.duration / self.S), 1.0)
        if self.equal:
            return np.array([least]), np.array([most])
        smallest, largest = self._products(self.S, layout)
        return (
            np.array([least, max(smallest / self.P - 1.0, -0.7)]),
            np.array([most, min(largest / self.P - 1.0, 2.0)]),
        )

    def _products(self, S: float, layout: Layout) -> tuple[float, float]:
        """Bounds of P: from a second lag that sampling cannot show to a damping ratio of 0.05."""
        return min(SHORTEST_LAG * layout.step * S, 0.2 * S * S), 100.0 * S * S

    def moved(self, log_steps: Floats, layout: Layout) -> SecondOrder:
        """The shape after a step of (log S, log P), or of log S alone, within what the layout can tell."""
        steps = np.exp(np.clip(log_steps, -1.0, 1.0))
        shortest, longest = SHORTEST_T * layout.step, LONGEST_T * layout.duration
        S = float(np.clip(self.S * steps[0], shortest, longest))
        if self.equal:
            return SecondOrder(S, S * S / 4.0, True)
        # A small second lag acts like dead time, linearly: its step is taken in P itself, not in log P.
        product = self.P * (1.0 + float(np.clip(log_steps[1], -0.7, 2.0)))
        return SecondOrder(S, float(np.clip(product, *self._products(S, layout))))

    def response(self, stretch: Stretch, L: float) -> tuple[Floats, Floats]:
        """The answer at the used rows and its slope in L, both (n,)."""
        if stretch.step is not None:
            came = _arrived(stretch, L)
            return self._through(came), -self._rate_through(came)
        u, straight = stretch.given.command, stretch.straight
        q, r = pair_states(u, stretch.intervals, self.S, self.P, straight=straight)
        at = delayed(stretch, L, (u, q, r, stretch.rates) if straight else (u, q, r))
        c0, c1, c2 = motion(self.S, self.P, at.since)
        held, q, r = at.series[:3]
        m = at.series[3] if straight else 0.0
        q, r = q + m * self.S, r - m
        # Later instants are earlier dead times: the slope in L is minus the speed's own rate.
        return np.asarray(held + m * (at.since - self.S) + c0 * q + c1 * r), np.asarray(c1 / self.P * q - c2 * r - m)

    def answer(self, stretch: Stretch, L: float) -> tuple[Floats, Floats, Floats]:
        """At the used rows: answer (n,), slopes in the logarithms (k, n), slope in L (n,)."""
        if stretch.step is not None:
            came = _arrived(stretch, L)
            here, slope_L = self._through(came), -self._rate_through(came)
            slopes = [(near._through(came) - here) / NUDGE for near in self._nearby()]
        else:
            here, slope_L = self.response(stretch, L)
            slopes = [(near.response(stretch, L)[0] - here) / NUDGE for near in self._nearby()]
        return here, np.stack(slopes), slope_L

    def _through(self, came: _Arrived) -> Floats:
        taps = self._taps(came)
        answer = came.held + lfilter(taps.speed, taps.poles, came.moves)[came.skip :]
        return np.asarray(answer if came.slope is None else answer + taps.by_slope * came.slope)

    def _rate_through(self, came: _Arrived) -> Floats:
        taps = self._taps(came)
        rate = lfilter(taps.rate, taps.poles, came.moves)[came.skip :]
        return np.asarray(rate if came.slope is None else rate + taps.rate_by_slope * came.slope)

    def _taps(self, came: _Arrived) -> Taps:
        return pair_taps(came.step, came.since, self.S, self.P, straight=came.slope is not None)

    def transients(self, time: Floats) -> tuple[Floats, Floats]:
        """Free motions from t = 0, (2, n), the second in units of the lags; slopes (k, 2, n)."""
        here = self._free(time)
        return here, np.stack([(near._free(time) - here) / NUDGE for near in self._nearby()])

    def _free(self, time: Floats) -> Floats:
        c0, c1, _ = motion(self.S, self.P, time)
        return np.stack((c0, c1 / self.S))

    def step(self, time: Floats) -> Floats:
        """The answer to a unit step, `time` s after it."""
        return 1.0 - motion(self.S, self.P, time)[0]

    def impulse(self, time: Floats) -> Floats:
        """The answer to a unit impulse, `time` s after it, per s."""
        return np.asarray(motion(self.S, self.P, time)[1] / self.P)

    def _nearby(self) -> tuple[SecondOrder, ...]:
        more = 1.0 + NUDGE
        if self.equal:
            return (SecondOrder(self.S * more, self.P * more * more, True),)
        return (SecondOrder(self.S * more, self.P), SecondOrder(self.S, self.P * more))
