"""Forms: one controller in the numbers that different panels ask for."""

from __future__ import annotations

import math
from dataclasses import dataclass

from ident.errors import Refused
from ident.loop import PidSettings


@dataclass(frozen=True, slots=True)
class Series:
    """Kc (1 + 1/(s tauI)) (1 + s tauD); Kc as Kp, tauI and tauD in s."""

    Kc: float
    tauI: float
    tauD: float


@dataclass(frozen=True, slots=True)
class Parallel:
    """Kp + ki/s + kd s; ki in the unit of Kp per s, kd in it times s."""

    Kp: float
    ki: float
    kd: float


@dataclass(frozen=True, slots=True)
class Forms:
    """The same controller in every form a panel may want.

    ideal                      as tuned
    series, series_because     None where it would need complex zeros, and the reason
    resets_per_minute          60/Ti of the ideal form; 0 without integral action
    gain_percent               Kp in percent of the command's span per percent of the speed's span
    proportional_band_percent  100/abs(gain_percent)
    percent_because            what to give where these two are None
    """

    ideal: PidSettings
    series: Series | None
    series_because: str
    parallel: Parallel
    resets_per_minute: float
    gain_percent: float | None
    proportional_band_percent: float | None
    percent_because: str


def forms(settings: PidSettings, *, speed_span: float | None = None, command_span: float | None = None) -> Forms:
    """Ideal, series and parallel form, proportional band and resets per minute.

    speed_span, command_span  of the controller's scales, in the units of the log, > 0; None: not known
    Raises Refused span-out-of-range. (Åström and Hägglund, Advanced PID Control, 2006, section 3.4.)
    """
    for name, span in (("speed_span", speed_span), ("command_span", command_span)):
        if span is not None and not 0.0 < span < math.inf:
            raise Refused("span-out-of-range", f"{name} must be finite and above 0; got {span}.")
    series, because = series_form(settings)
    percent = None
    if speed_span is not None and command_span is not None:
        percent = settings.Kp * speed_span / command_span
    return Forms(
        ideal=settings,
        series=series,
        series_because=because,
        parallel=Parallel(settings.Kp, settings.Kp / settings.Ti, settings.Kp * settings.Td),
        resets_per_minute=60.0 / settings.Ti,
        gain_percent=percent,
        proportional_band_percent=None if percent is None else 100.0 / abs(percent),
        percent_because=""
        if percent is not None
        else "Give the spans of the controller's speed and command scales (speed_span, command_span) to get these.",
    )


def series_form(settings: PidSettings) -> tuple[Series | None, str]:
    """The series form, or None with the reason: it has real zeros only, so it exists where Ti >= 4 Td."""
    Kp, Ti, Td = settings.Kp, settings.Ti, settings.Td
    if math.isinf(Ti):
        return Series(Kp, Ti, Td), ""
    if Ti < 4.0 * Td:
        return None, (
            f"Ti is {Ti / Td:.3g} Td, and a series controller needs Ti of at least 4 Td: its zeros are real. "
            "Tune a PI, or use a controller of the ideal or parallel form."
        )
    share = (1.0 + math.sqrt(1.0 - 4.0 * Td / Ti)) / 2.0
    return Series(Kp * share, Ti * share, Td / share), ""


def ideal_form(series: Series) -> PidSettings:
    """The ideal form of a series controller, without filter."""
    factor = 1.0 + (0.0 if math.isinf(series.tauI) else series.tauD / series.tauI)
    return PidSettings(series.Kc * factor, series.tauI * factor, series.tauD / factor)
