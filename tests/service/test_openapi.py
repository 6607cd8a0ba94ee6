"""The OpenAPI document: what it says is what the service does."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
import schemathesis
from conftest import ROOT, apart, start_served
from hypothesis import HealthCheck, given, settings
from schemathesis.config import SchemathesisConfig
from starlette.testclient import TestClient

from service.app import create_app

# A text/csv body is any text, so well-formed requests are refused for what the log says (422), and a loop that was
# just made has no baseline (409); and "data that the schema forbids must be refused" finds odd text that is a log all
# the same.
CONFIG = SchemathesisConfig.from_dict(
    {
        "checks": {
            "negative_data_rejection": {"enabled": False},
            "positive_data_acceptance": {"expected-statuses": ["2xx", "404", "409", "422"]},
        }
    }
)


@pytest.fixture(scope="module")
def described() -> Iterator[Any]:
    # A service of its own: the loops that random names make must not stand in other tests' lists.
    served = start_served(workers="1")
    yield schemathesis.openapi.from_url(f"http://{served.host}:{served.port}/openapi.json", config=CONFIG)
    served.process.terminate()
    served.process.communicate(timeout=30)


def operations() -> list[tuple[str, str]]:
    paths = create_app(apart()).openapi()["paths"]
    return [(path, method.upper()) for path, methods in paths.items() for method in methods]


@pytest.mark.parametrize(("path", "method"), operations())
def test_nothing_the_document_allows_breaks_the_service(described: Any, path: str, method: str) -> None:
    @given(case=described[path][method].as_strategy())
    @settings(max_examples=15, deadline=None, suppress_health_check=list(HealthCheck))
    def holds(case: Any) -> None:
        case.call_and_validate()

    holds()


@pytest.mark.parametrize("name", ["step_test", "setpoint_change", "oscillating", "nothing_to_learn"])
def test_a_real_report_has_the_shape_that_is_promised(client: TestClient, described: Any, name: str) -> None:
    log = (ROOT / "sample_logs" / f"{name}.csv").read_bytes()
    response = client.post("/v1/reports", content=log, headers={"Content-Type": "text/csv"})
    assert response.status_code == 200, response.text
    described["/v1/reports"]["POST"].validate_response(response)


def test_every_problem_has_its_own_media_type(client: TestClient) -> None:
    document = client.get("/openapi.json").json()
    for path in document["paths"].values():
        for operation in path.values():
            for status, answer in operation["responses"].items():
                if status.startswith(("4", "5")):
                    assert list(answer["content"]) == ["application/problem+json"]


def test_the_query_options_are_the_contract_s(client: TestClient) -> None:
    """The names that scripts outside rely on: ../shared/design/contract.md, the query options of the uploads."""
    document = client.get("/openapi.json").json()
    names = {parameter["name"] for parameter in document["paths"]["/v1/reports"]["post"]["parameters"]}
    assert names >= {
        "model", "Ms", "form", "goal", "period", "zone", "date_order", "start", "counts_per_rev",
        "time", "setpoint", "command", "speed",
    }  # fmt: skip
