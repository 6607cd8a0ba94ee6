"""The errors a caller's data can cause.

    IdentError                 code, message (what is wrong and what to do), evidence
    ├── ReadError              a log that cannot be read; the evidence names line and column
    ├── NotIdentifiable        a readable record that cannot carry the model asked for
    └── Refused                a request without an answer: out of range, unbounded, unreachable

Each carries a stable `code`, is safe to print, and survives pickling (workers hand them back).
"""

from __future__ import annotations

from collections.abc import Mapping

Evidence = Mapping[str, float | int | str | bool | None]


class IdentError(Exception):
    """A caller's data or request cannot be answered; `message` says what to do."""

    def __init__(self, code: str, message: str, evidence: Evidence | None = None) -> None:
        # All three go to Exception.args, so that pickle can call the constructor again.
        super().__init__(code, message, dict(evidence or {}))
        self.code = code
        self.message = message
        self.evidence = dict(evidence or {})

    def __str__(self) -> str:
        return f"{self.code}: {self.message}"


class ReadError(IdentError):
    """A log that cannot be read as a table of time, command and speed."""


class NotIdentifiable(IdentError):
    """A record with too little in it for the model asked for."""


class Refused(IdentError):
    """A request without an answer: out of range, unbounded, unreachable."""
