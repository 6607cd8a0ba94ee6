"""Margins of a loop: stability by Nyquist count, then Ms, Mt, gain, phase and delay margin."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Margins:
    """Robustness of a closed loop.

    stable            from the Nyquist count; where False the other fields are None
    Ms, Mt            suprema of abs(S) and abs(T(s))
    gain_margin       factor; None (with stable True) where no gain makes the loop unstable
    phase_margin_deg  degrees; None where abs of the loop never crosses 1
    delay_margin_s    s; None likewise
    """

    stable: bool
    Ms: float | None
    Mt: float | None
    gain_margin: float | None
    phase_margin_deg: float | None
    delay_margin_s: float | None
