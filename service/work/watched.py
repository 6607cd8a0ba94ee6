"""Watched: which controller's margins a loop is followed with, and who says that it is in the machine."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import ident
from service.store import KeptLoop, Store
from service.work.loop_settings import LoopSettings
from service.work.numbers import Numbers, Units, read_numbers

Source = Literal["installed", "log", "baseline"]


@dataclass(frozen=True, slots=True)
class Watched:
    """Settings, None where neither the loop nor any log knows them, and where they come from.

    delay     s, from a logged speed to the command that answers to it
    seen_in   report whose log shows it
    """

    settings: ident.PidSettings | None
    source: Source
    delay: float = 0.0
    seen_in: str | None = None


def watched(store: Store, loop: KeptLoop, settings: LoopSettings, units: Units) -> Watched:
    """The settings told as installed, else those that the latest log in these units shows, where one does."""
    if settings.controller is not None:
        return Watched(settings.controller, "installed")
    for report in reversed(store.reports.history(loop.name)):
        numbers = read_numbers(report.numbers)
        seen = numbers.recovered
        if seen is not None and numbers.units == units:
            return Watched(ident.PidSettings(**seen.settings), "log", seen.late_s, report.id)
    return Watched(None, "baseline")


def period_of(settings: LoopSettings, numbers: Numbers) -> float:
    """The controller's period as told, or what the report took for it."""
    return settings.period if settings.period is not None else numbers.period_s or 0.0
