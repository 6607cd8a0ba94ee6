"""Logs kept with a loop over HTTP, waited for."""

from __future__ import annotations

from typing import Any

from starlette.testclient import TestClient

WAIT = {"Prefer": "wait=60"}


def keep(service: TestClient, body: bytes, loop: str = "pan", *, query: str = "", expected: int = 201) -> Any:
    response = service.post(f"/v1/loops/{loop}/logs{query}", content=body, headers=WAIT)
    assert response.status_code == expected, response.text
    return response.json()


def variant(log: bytes, day: int) -> bytes:
    """The same log of another day."""
    assert b"2026-11-17" in log
    return log.replace(b"2026-11-17", b"2026-11-%02d" % day)
