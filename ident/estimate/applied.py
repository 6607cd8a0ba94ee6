"""Applied: the command that reached the motor, where the logged one goes beyond the loop's limits.

A controller may log what it asked for before its limit. The motor answers to what the limit let through.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ident.findings import Finding
from ident.record import LoopRecord


def applied(record: LoopRecord, limits: tuple[float | None, float | None]) -> tuple[LoopRecord, tuple[Finding, ...]]:
    """The record with its command within (low, high), and a finding where that changed it; None leaves a side open."""
    low, high = limits
    if low is None and high is None:
        return record, ()
    within = np.clip(record.command, low, high)
    beyond = int(np.count_nonzero(np.abs(record.command - within) > 0.0))
    if not beyond:
        return record, ()
    said = " to ".join("open" if limit is None else f"{limit:.4g}" for limit in limits)
    return replace(record, command=within), (
        Finding(
            "command-beyond-limits",
            "warning",
            f"The logged command lies beyond the loop's limits ({said} {record.command_unit}".rstrip()
            + f") in {beyond} of {record.rows} rows: what the limits let through was taken as the motor's command. "
            "Check the limits if the drive has others.",
            {"rows": beyond, "low": low, "high": high},
        ),
    )
