"""What a signal looks like: its quantisation step, its time at a limit, its refresh period, a frozen sensor."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.findings import Finding
from ident.record.segments import Flags, Floats, spans

LOOKED_AT = 20_000  # rows; steps and refresh show in far fewer
COARSE = 256  # steps over the range: an 8-bit converter
AT_LIMIT = 0.05  # share of rows
FROZEN = 0.5  # share of rows in one run of equal values
PERIODIC = 0.8  # share of intervals between changes that are equal
_LEVELS = 10  # a command with fewer values is a series of steps, not one driven into its limit
_CHANGES = 10
_STAY = 3  # rows
_FULL = {"%": (100.0,), "": (100.0,)}


@dataclass(frozen=True, slots=True)
class Character:
    """quantum       smallest step of which all differences are multiples, or None
    at_low, at_high  share of rows at the lowest and the highest value, in stays of a few rows
    stays_low, stays_high  how many stays
    refresh_rows     rows between changes where these are regular, 1 where it changes row by row, None if unclear
    longest_run      share of rows in the longest run of one value
    """

    quantum: float | None
    levels: int
    at_low: float
    stays_low: int
    at_high: float
    stays_high: int
    lowest: float
    highest: float
    refresh_rows: int | None
    longest_run: float


def character(values: Floats) -> Character | None:
    """Look at a signal; None where it has fewer than two values.

    values    (n,), NaN where missing
    """
    known = values[np.isfinite(values)]
    if len(known) < 2:
        return None
    lowest, highest = float(known.min()), float(known.max())
    part = known[:LOOKED_AT]
    levels = np.unique(part)
    changes = np.flatnonzero(np.diff(part))
    runs = np.diff(np.concatenate(([-1], changes, [len(part) - 1])))
    refresh = None
    if len(changes) >= _CHANGES:
        between = np.diff(changes)
        usual = int(np.bincount(between).argmax())
        refresh = usual if np.mean(between == usual) >= PERIODIC else None
    return Character(
        _quantum(levels),
        len(levels),
        *_stays(known == lowest),
        *_stays(known == highest),
        lowest,
        highest,
        refresh,
        float(runs.max() / len(part)),
    )


def _stays(there: Flags) -> tuple[float, int]:
    """Share of rows in runs of at least _STAY rows, and how many runs."""
    found = spans(there)
    long = found[:, 1] - found[:, 0]
    long = long[long >= _STAY]
    return float(long.sum() / len(there)), len(long)


def _quantum(levels: Floats) -> float | None:
    if len(levels) < 3:
        return None
    steps = np.diff(levels)
    steps = steps[steps > 1e-9 * max(abs(float(levels[0])), abs(float(levels[-1])))]
    if len(steps) == 0:
        return None
    quantum = float(steps.min())
    off = np.abs(steps / quantum - np.round(steps / quantum))
    return float(f"{quantum:.6g}") if float(off.max()) < 0.02 else None


def findings(looks: dict[str, Character], units: dict[str, str], step: float | None) -> list[Finding]:
    """coarse-quantisation, command-saturated, speed-frozen and slow-refresh.

    looks    {role: character}
    units    {role: unit}
    step     s, of the rows, or None
    """
    found = []
    speed, command = looks.get("speed"), looks.get("command")
    for role, look in looks.items():
        span = look.highest - look.lowest
        if role != "setpoint" and look.quantum and look.levels > _LEVELS and span <= COARSE * look.quantum:
            unit = f" {units.get(role, '')}".rstrip()
            message = f"The {role} moves in steps of {look.quantum:.4g}{unit}: what is finer was not logged."
            found.append(Finding("coarse-quantisation", "info", message, {"role": role, "quantum": look.quantum}))
    if command:
        # A level that is visited once, before a step or after it, is no limit.
        driven = command.levels > _LEVELS
        full = command.highest in _FULL.get(units.get("command", ""), ()) or (driven and command.stays_high > 1)
        for share, value, counts in (
            (command.at_high, command.highest, full),
            (command.at_low, command.lowest, driven and command.stays_low > 1),
        ):
            if counts and share >= AT_LIMIT:
                message = (
                    f"The command stands at {value:.6g} in {100 * share:.0f} % of the rows: the controller is at its "
                    "limit there, and the loop is open."
                )
                found.append(Finding("command-saturated", "warning", message, {"value": value, "share": share}))
                break
    if speed and speed.longest_run >= FROZEN and command:
        message = (
            f"The speed holds one value in {100 * speed.longest_run:.0f} % of the rows on end: check the sensor and "
            "the logger."
        )
        found.append(Finding("speed-frozen", "warning", message, {"share": speed.longest_run}))
    elif speed and speed.refresh_rows and speed.refresh_rows > 1:
        period = f" ({speed.refresh_rows * step:.4g} s)" if step else ""
        message = (
            f"The speed changes every {speed.refresh_rows} rows{period} only: it is refreshed slower than it is "
            "logged, and may be filtered for display. Both look like dead time."
        )
        found.append(Finding("slow-refresh", "warning", message, {"rows": speed.refresh_rows, "step_s": step}))
    return found
