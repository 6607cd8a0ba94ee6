"""Excitation: does the log move enough to learn from?"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Excitation:
    """Does the log move enough to learn from?

    command_span, command_moves   span of the command over the used rows; number of moves that stand out
    reason                        one sentence
    """

    sufficient: bool
    command_span: float
    speed_span: float
    command_moves: int
    reason: str


@dataclass(frozen=True, slots=True)
class Advice:
    """The next test to run where the log is too poor, in the log's units."""

    message: str
