"""Whole series of nights over HTTP: a loop that stays is never called moved, a step of its gain soon is."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
from conftest import apart
from nights import INSTALLED, nights
from starlette.testclient import TestClient

from service.app import create_app

BASELINE = 3


@pytest.fixture(scope="module")
def service() -> Iterator[TestClient]:
    with TestClient(create_app(apart(workers=2))) as service:
        yield service


def verdicts(service: TestClient, name: str, logs: list[bytes]) -> list[dict[str, Any]]:
    """What is said after each night behind the baseline, as a script that runs every night would read it."""
    service.put(f"/v1/loops/{name}", json={"period": 0.1, "installed": INSTALLED})
    said = []
    for n, log in enumerate(logs):
        posted = service.post(f"/v1/loops/{name}/logs", content=log, headers={"Prefer": "wait=60"})
        assert posted.json()["status"] == "done", posted.text
        if n == BASELINE - 1:
            ids = [row["report_id"] for row in service.get(f"/v1/loops/{name}/history").json()]
            assert service.put(f"/v1/loops/{name}/baseline", json={"report_ids": ids}).status_code == 200
        elif n >= BASELINE:
            said.append(service.get(f"/v1/loops/{name}/drift").json())
    return said


def test_ten_unchanged_nights_are_never_called_moved(service: TestClient) -> None:
    said = verdicts(service, "steady", nights(10, seed=11))
    assert len(said) == 7
    assert all(one["verdict"] != "moved" and one["since"] is None for one in said)
    # And not because nothing could be seen.
    assert sum(one["verdict"] == "not-moved" for one in said) >= 6


@pytest.mark.parametrize("factor", [1.25, 0.75])
def test_a_step_of_the_gain_is_named_within_two_nights(service: TestClient, factor: float) -> None:
    step = BASELINE + 1
    said = verdicts(service, f"step {factor}", nights(step + 2, gain={step: factor}, seed=12))
    assert said[0]["verdict"] != "moved"
    assert any(one["verdict"] == "moved" and one["parameters"]["K"]["verdict"] == "moved" for one in said[1:])
    K = said[-1]["parameters"]["K"]
    assert K["now"] / K["baseline"] == pytest.approx(factor, rel=0.05)
