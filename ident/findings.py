"""Finding: a flaw or a fact about a log that still allows an answer."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

Severity = Literal["info", "warning", "error"]
Value = float | int | str | bool | None


@dataclass(frozen=True, slots=True)
class Finding:
    """What was noticed, how much it matters, and the figures behind it.

    code      stable, lower case with hyphens; scripts may rely on it
    severity  info: worth knowing; warning: check before use; error: do not use without mending it
    message   one or two sentences for the person at the machine, units included
    evidence  the numbers behind the message, units in the keys
    """

    code: str
    severity: Severity
    message: str
    evidence: dict[str, Value] = field(default_factory=dict)
