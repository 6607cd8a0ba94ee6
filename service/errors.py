"""What is told to a caller who cannot be served.

    Problem          the value: a stable code, a sentence that says what to do, the figures behind it
    └── ProblemError the same on its way up to whoever answers (api: problem+json; command: standard error)

A problem knows no HTTP: `service.api.problems` gives each code its status.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

Value = float | int | str | bool | None


@dataclass(frozen=True, slots=True)
class Problem:
    """Why a request has no answer.

    code      stable, lower case with hyphens; scripts may rely on it
    detail    what is wrong and what to do
    evidence  the figures behind it, units in the keys
    """

    code: str
    detail: str
    evidence: dict[str, Value] = field(default_factory=dict)


class ProblemError(Exception):
    """Carries a Problem to the one place that answers."""

    def __init__(self, code: str, detail: str, evidence: Mapping[str, Value] | None = None) -> None:
        super().__init__(code, detail, dict(evidence or {}))
        self.problem = Problem(code, detail, dict(evidence or {}))

    @classmethod
    def of(cls, problem: Problem) -> ProblemError:
        return cls(problem.code, problem.detail, problem.evidence)
