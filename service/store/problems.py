"""Problems as text, and back."""

from __future__ import annotations

import json

from service.errors import Problem


def write_problem(problem: Problem) -> str:
    """JSON; what is not finite in the evidence becomes null, for a database or a reader may refuse NaN."""
    evidence = {
        name: None if isinstance(value, float) and not abs(value) < float("inf") else value
        for name, value in problem.evidence.items()
    }
    told = {"code": problem.code, "detail": problem.detail, "evidence": evidence}
    return json.dumps(told, allow_nan=False)


def read_problem(text: str | None) -> Problem | None:
    return None if text is None else Problem(**json.loads(text))
