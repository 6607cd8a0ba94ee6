"""Signals that each report at their own times (on change, or by their own clock) to the rows of one record.

The command and the setpoint hold until their next report. The speed is never interpolated: on a steady clock of
its own its reports are the rows; where it is reported on change, it is unchanged (within the deadband) between
reports, and the rows where the command was reported join, so that no move of the command loses its time.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.errors import ReadError
from ident.findings import Finding, Value
from ident.record.quote import counted
from ident.record.segments import Flags, Floats, Lines, steady_step

Rows = NDArray[np.intp]

CHATTER = 0.3  # share of reports that turn back; a moving speed turns in 5 to 15 % of them, noise in half


@dataclass(frozen=True, slots=True, eq=False)
class Signal:
    """Reports of one signal.

    time     (n,), s, strictly increasing
    value    (n,), NaN where the report itself is bad
    line     (n,) file lines
    """

    time: Floats
    value: Floats
    line: Lines


@dataclass(frozen=True, slots=True, eq=False)
class Merged:
    """Rows of all signals together; a value is NaN where its last report was bad.

    held    (n,), rows whose speed is its last report, where it is reported on change; else None
    """

    time: Floats
    values: dict[str, Floats]
    line: Lines
    held: Flags | None
    findings: tuple[Finding, ...]


def merge(signals: dict[str, Signal], *, on_change: bool | None = None) -> Merged:
    """Bring signals to common rows.

    on_change   the speed is reported on change; None: judged by how even its reports are

    Raises ReadError: no-overlap.
    """
    speed, command = signals["speed"], signals["command"]
    step, steady = steady_step(np.diff(speed.time))
    on_change = not steady if on_change is None else on_change
    time, line = speed.time, speed.line
    if on_change:
        everything = np.concatenate((speed.time, command.time))
        time, first = np.unique(everything, return_index=True)
        line = np.concatenate((speed.line, command.line))[first]
    begin = max(s.time[0] for s in (speed, command))
    early = int(np.searchsorted(time, begin))
    time, line = time[early:], line[early:]
    if len(time) < 2:
        raise ReadError(
            "no-overlap",
            "Command and speed were not logged at the same time: export both over the same span.",
            {"command_from_s": float(command.time[0]), "speed_from_s": float(speed.time[0])},
        )
    values = {}
    for role, signal in signals.items():
        at = np.searchsorted(signal.time, time, side="right") - 1
        values[role] = np.where(at >= 0, signal.value[np.maximum(at, 0)], np.nan)
    told = _on_change(speed, command, time, step, early) if on_change else _held(command, time, early)
    held = ~np.isin(time, speed.time) if on_change else None
    return Merged(time, values, line, held, (told,))


def _on_change(speed: Signal, command: Signal, time: Floats, step: float, early: int) -> Finding:
    moves = np.diff(speed.value[np.isfinite(speed.value)])
    moves = moves[moves != 0]
    deadband = float(np.abs(moves).min()) if len(moves) else 0.0
    turning = float(np.mean(moves[1:] * moves[:-1] < 0)) if len(moves) > 1 else 0.0
    held = int(len(time) - np.isin(time, speed.time).sum())
    gap = float(np.diff(speed.time).max()) if len(speed.time) > 1 else 0.0
    message = (
        f"The log is reported on change: values hold until their next report, and in {counted(held)} the speed is its "
        f"last report. No two reports of the speed lie closer than {deadband:.4g}: that deadband is a noise floor "
        f"of the fit, and a dead time is known no finer than the reports, {step:.4g} s apart and up to {gap:.4g} s."
    )
    if turning > CHATTER:
        message += (
            f" {100 * turning:.0f} % of the reports turn back: noise sets them off, and intervals come out too narrow. "
            "Log at a fixed rate, or with a deadband of several times the noise."
        )
    evidence: dict[str, Value] = {
        "rows_held": held,
        "deadband": deadband,
        "turning_share": turning,
        "median_step_s": step,
        "longest_step_s": gap,
        "command_reports": len(command.time),
        "rows_before_all_signals": early,
    }
    return Finding("exception-reported", "warning", message, evidence)


def _held(command: Signal, time: Floats, early: int) -> Finding:
    moved = np.concatenate(([False], np.diff(command.value) != 0)) & (command.time > time[0])
    at = np.minimum(np.searchsorted(time, command.time[moved]), len(time) - 1)
    lag = np.maximum(time[at] - command.time[moved], 0.0)
    _, count = np.unique(at, return_counts=True)
    lost = int((count - 1).sum())
    largest = float(lag.max()) if len(lag) else 0.0
    mean = float(lag.mean()) if len(lag) else 0.0
    message = (
        f"Each signal has its own clock: the rows are those of the speed, command and setpoint hold between their "
        f"reports. Moves of the command stand up to {largest:.4g} s late ({mean:.4g} s on average)"
        + (f", and {counted(lost, 'of them lies', 'of them lie')} hidden between two rows" if lost else "")
        + "; a dead time is known no finer."
    )
    evidence: dict[str, Value] = {
        "largest_lag_s": largest,
        "mean_lag_s": mean,
        "moves_lost": lost,
        "rows_before_all_signals": early,
    }
    return Finding("own-clocks", "info" if largest == 0 else "warning", message, evidence)
