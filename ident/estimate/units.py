"""Units of what is estimated, from those of the record."""

from __future__ import annotations

from ident.record import LoopRecord


def gain_unit(record: LoopRecord) -> str:
    """Of K: speed unit per command unit."""
    return f"{_bare(record.speed_unit or 'speed')}/{_bare(record.command_unit or 'command')}"


def gain_rate_unit(record: LoopRecord) -> str:
    """Of K/T: speed unit per command unit and second."""
    return f"{_bare(record.speed_unit or 'speed')}/({_bare(record.command_unit or 'command')}·s)"


def _bare(unit: str) -> str:
    """A unit that may stand beside a solidus: compound ones go into brackets."""
    return f"({unit})" if any(sign in unit for sign in "/ ·*") else unit
