"""Digital: the coefficients of a PID at its controller's period, in positional and velocity form."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from ident.errors import Refused
from ident.loop import PidSettings
from ident.realise.difference import Difference, Row, Rule, substitute

FilterOn = Literal["speed", "derivative"]

BUMPLESS = (
    "I is the integral part of the command, D the derivative part. At the switch from manual set "
    "I = u_manual - Kp (b r - y) - D with the filters run in on the measured speed, so that the first output "
    "is the manual one. When Kp changes while running, add (Kp_old - Kp_new) e to I."
)


@dataclass(frozen=True, slots=True)
class Block:
    """num(q)/den(q) in q = z^-1, coefficients of q^0, q^1, ...; den[0] = 1."""

    num: Row
    den: Row


@dataclass(frozen=True, slots=True)
class Digital:
    """One PID at the period h, s, its terms apart and drawn together.

    rule           backward (difference) or tustin
    Ti, Td, Tf     s, of the continuous controller; Tf of the filter that is used
    filter_on      speed: y_f = F y, F = 1/(1 + s Tf + (s Tf)^2/2); derivative: 1/(1 + s Tf) on it alone, Tf = Td/N
    Kp, b          u = Kp (b r - y_f) + I - D
    integral_step  I[k] = I[k-1] + integral_step e[k], with e[k] + e[k-1] for e[k] by Tustin's rule
    speed_filter   y to y_f;  derivative  y to D: Kp Td s with its filter
    positional     den(q) u = num(q) e, the feedback path drawn together
    velocity       rest(q) du = num(q) e: the same with the integrator taken out, u[k] = u[k-1] + du[k]
    setpoint       Kp (b + 1/(s Ti)) from the setpoint; where b is 1 and no filter stands on the speed, e takes it along
    tracking_time  s, of the anti-windup feedback I += h/Tt (u_limited - u); None without integral action
    rings          Tustin's derivative alternates in sign from sample to sample here
    """

    rule: Rule
    filter_on: FilterOn
    h: float
    Kp: float
    b: float
    Ti: float
    Td: float
    Tf: float
    integral_step: float
    speed_filter: Block
    derivative: Block
    positional: Block
    velocity: Block
    setpoint: Block
    tracking_time: float | None
    bumpless: str
    rings: bool

    @property
    def feedback(self) -> Difference:
        """The feedback path, for margins."""
        return Difference(self.velocity.num, self.velocity.den, self.h, self.Ti, self.Td, self.Tf)


def digital(
    settings: PidSettings, h: float, *, rule: Rule = "backward", filter_on: FilterOn = "speed", N: float | None = None
) -> Digital:
    """Coefficients of a controller at its period.

    h       s, > 0
    N       with filter_on "derivative": Td/Tf, > 0; None: Tf of the settings
    Raises Refused: period-out-of-range, no-integral-action, filter-out-of-range, derivative-without-filter.
    (Åström and Wittenmark, Computer-Controlled Systems, 1997, section 8.4; Åström and Hägglund, Advanced PID
    Control, 2006, section 13.4.)
    """
    s = settings
    if not 0.0 < h < math.inf:
        raise Refused("period-out-of-range", f"A digital controller has a period above 0 s; got {h}.")
    if math.isinf(s.Ti):
        raise Refused("no-integral-action", "Coefficients are made for controllers that integrate: give a finite Ti.")
    if N is not None and not 0.0 < N < math.inf:
        raise Refused("filter-out-of-range", f"N = Td/Tf must be finite and above 0; got {N}.")
    Tf = s.Td / N if N is not None and filter_on == "derivative" else s.Tf
    if rule == "tustin" and s.Td > 0 and Tf == 0:
        raise Refused(
            "derivative-without-filter",
            "By Tustin's rule a derivative without filter rings for ever: give a filter, or use backward differences.",
        )
    lag: Row = (1.0, Tf, Tf**2 / 2.0) if filter_on == "speed" else (1.0, Tf)
    lag = _trimmed(lag)
    # s Ti (1 + ...) is divided out below: the integrator stays apart and exact.
    pid: Row = (1.0, s.Ti, s.Ti * s.Td) if filter_on == "speed" else _with_lag(s, Tf)
    num, den = substitute(tuple(s.Kp / s.Ti * v for v in _trimmed(pid)), (0.0, *lag), h, rule)
    rest = tuple(np.cumsum(den)[:-1].tolist())  # den/(1 - q)
    num, rest = _trimmed(num), _trimmed(rest)
    one = Block((1.0,), (1.0,))
    filtered = Block(*substitute((1.0,), lag, h, rule)) if filter_on == "speed" else one
    derivative = Block(*substitute((0.0, s.Kp * s.Td), lag, h, rule)) if s.Td > 0 else Block((0.0,), (1.0,))
    integral = s.Kp * h / s.Ti / (1.0 if rule == "backward" else 2.0)
    return Digital(
        rule=rule,
        filter_on=filter_on,
        h=h,
        Kp=s.Kp,
        b=s.b,
        Ti=s.Ti,
        Td=s.Td,
        Tf=Tf,
        integral_step=integral,
        speed_filter=filtered,
        derivative=derivative,
        positional=Block(num, tuple(np.convolve([1.0, -1.0], rest).tolist())),
        velocity=Block(num, rest),
        setpoint=Block(*substitute((s.Kp / s.Ti, s.Kp * s.b), (0.0, 1.0), h, rule)),
        tracking_time=math.sqrt(s.Ti * s.Td) if s.Td > 0 else s.Ti,
        bumpless=BUMPLESS,
        rings=rule == "tustin" and s.Td > 0 and filter_on == "derivative" and 2.0 * Tf < h,
    )


def _with_lag(s: PidSettings, Tf: float) -> Row:
    """Ti s times 1 + 1/(s Ti) + s Td/(1 + s Tf), times 1 + s Tf."""
    return (1.0, s.Ti + Tf, s.Ti * (s.Td + Tf))


def _trimmed(row: Row) -> Row:
    """Without trailing coefficients that are rounding."""
    largest = max(abs(v) for v in row)
    last = max(i for i, v in enumerate(row) if abs(v) > 1e-14 * largest)
    return tuple(row[: last + 1])
