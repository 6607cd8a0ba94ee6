"""Stages: how far a log is; those of a worker are told through one byte that it shares with the service."""

from __future__ import annotations

from ctypes import c_byte
from multiprocessing.context import BaseContext

STORING = "storing"  # the service's own, after the worker's
STAGES = ("reading", "fitting", "judging", "tuning", STORING)

_mine: Stage | None = None


class Stage:
    """The byte, seen from both processes; made by the service, handed to the worker as it starts."""

    def __init__(self, context: BaseContext) -> None:
        self._byte = context.RawValue(c_byte, 0)

    def set(self, stage: str) -> None:
        self._byte.value = STAGES.index(stage)

    def get(self) -> str:
        return STAGES[self._byte.value]


def progress(stage: str) -> float:
    """The share of the stages that have been left behind."""
    return STAGES.index(stage) / len(STAGES)


def tell(stage: Stage) -> None:
    """In a worker: where to tell the stage from now on."""
    global _mine
    _mine = stage


def enter(stage: str) -> None:
    """Say that a stage begins; where nobody listens, nothing happens."""
    if _mine is not None:
        _mine.set(stage)
