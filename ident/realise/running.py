"""Running: one sample of a digital PI with anti-windup, and the start values that make no bump."""

from __future__ import annotations


def start_value(u_manual: float, Kp: float, e: float, D: float = 0.0) -> float:
    """I at the switch to automatic, so that the first output is the manual one; e = b r - y of that sample."""
    return u_manual - Kp * e - D


def after_gain_change(integral: float, Kp_old: float, Kp_new: float, e: float) -> float:
    """I that keeps the output where it is when Kp changes while running."""
    return integral + (Kp_old - Kp_new) * e


def run_pi(
    integral: float, e: float, *, Kp: float, Ti: float, h: float, Tt: float, low: float, high: float
) -> tuple[float, float]:
    """(output, I of the next sample): v = Kp e + I limited to low..high, and what was cut off is fed back to I.

    Tt  s, tracking time (inf: no anti-windup). (Åström and Hägglund, Advanced PID Control, 2006, section 3.5.)
    """
    wanted = Kp * e + integral
    output = min(max(wanted, low), high)
    return output, integral + Kp * h / Ti * e + h / Tt * (output - wanted)
