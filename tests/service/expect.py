"""The one way to say which problem is expected."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

MEMBERS = {"type", "title", "status", "detail", "code", "evidence"}


def problem(status: int, headers: Mapping[str, str], body: bytes, *, expected: int, code: str) -> dict[str, Any]:
    """The members of a problem+json answer (RFC 9457), after checking its shape, status and code."""
    told: dict[str, Any] = json.loads(body, parse_constant=_refuse)
    assert (status, told.get("code")) == (expected, code), told
    assert headers["content-type"] == "application/problem+json"
    assert set(told) == MEMBERS
    assert told["status"] == status
    assert told["type"] == "about:blank"
    assert told["title"]
    # A sentence (or more) for the person at the machine, not a word, not a traceback.
    assert len(told["detail"]) > 20
    assert told["detail"].endswith((".", "?"))
    assert "Traceback" not in told["detail"]
    return told


def answer(response: Any, *, expected: int, code: str) -> dict[str, Any]:
    """`problem` of a test client's response."""
    return problem(response.status_code, response.headers, response.content, expected=expected, code=code)


def _refuse(word: str) -> None:
    raise AssertionError(f"{word} is not JSON")
