"""Everything beside the reports: health, figures, samples, the page, and errors of routing."""

from __future__ import annotations

from pathlib import Path

import expect
import pytest
from conftest import apart
from fastapi import FastAPI
from lane_tasks import obey
from starlette.testclient import TestClient

from service.api import problems
from service.app import create_app


def test_health(client: TestClient) -> None:
    assert client.get("/healthz").json() == {"status": "alive"}
    assert client.get("/readyz").json() == {"status": "ready", "workers": 1}


def test_not_ready_before_the_workers_run() -> None:
    idle = TestClient(create_app(apart()))  # not entered: its start-up has not run
    assert idle.get("/healthz").status_code == 200
    expect.answer(idle.get("/readyz"), expected=503, code="not-ready")


def test_metrics_count_routes_and_outcomes(client: TestClient) -> None:
    client.get("/made/up/by/a/caller")
    client.post("/v1/reports", content=b"")
    response = client.get("/metrics")
    assert response.headers["content-type"].startswith("text/plain")
    assert "made/up" not in response.text
    assert 'gainwright_requests_total{method="GET",route="none",status="404"}' in response.text
    assert 'gainwright_requests_total{method="POST",route="/v1/reports",status="422"}' in response.text
    assert "gainwright_analyses_total{outcome=" in response.text


def test_samples_are_listed_and_sent(client: TestClient, step_test: bytes) -> None:
    (sample, *_) = [s for s in client.get("/v1/samples").json() if s["name"] == "step_test.csv"]
    assert sample["size_bytes"] == len(step_test)
    response = client.get(sample["href"])
    assert response.content == step_test
    assert response.headers["content-type"].startswith("text/csv")


@pytest.mark.parametrize("name", ["none.csv", "..%2Findex.html", "..%2F..%2Fapp.py", "%00"])
def test_only_samples_are_sent(client: TestClient, name: str) -> None:
    response = client.get(f"/v1/samples/{name}")
    code = response.json()["code"]
    assert code in {"no-such-sample", "not-found"}
    expect.answer(response, expected=404, code=code)


def test_the_page_and_its_files(client: TestClient) -> None:
    page = client.get("/")
    assert page.status_code == 200
    assert page.headers["content-type"].startswith("text/html")
    assert page.headers["content-security-policy"].startswith("default-src 'self'")
    assert page.headers["cache-control"] == "no-cache"
    again = client.get("/page/index.html", headers={"If-None-Match": page.headers["etag"]})
    assert again.status_code in {200, 304}
    assert client.head("/").status_code == 200
    expect.answer(client.get("/page/../app.py"), expected=404, code="not-found")
    expect.answer(client.get("/page/%2e%2e/app.py"), expected=404, code="not-found")


def test_the_page_asks_nothing_of_other_hosts() -> None:
    folder = Path(__file__).resolve().parents[2] / "service" / "page"
    for file in [*folder.glob("*.html"), *folder.glob("*.css"), *folder.glob("*.js")]:
        text = file.read_text()
        for reach in ('src="http', 'src="//', "url(http", "url(//", '@import "http', 'from "http'):
            assert reach not in text, f"{file.name}: {reach}"


@pytest.mark.parametrize("path", ["/nowhere", "/docs", "/redoc", "/v1/", "/v1/reports/", "/page/nothing.js"])
def test_an_unknown_address_is_a_problem(client: TestClient, path: str) -> None:
    expect.answer(client.get(path), expected=404, code="not-found")


@pytest.mark.parametrize(
    ("method", "path"),
    [("GET", "/v1/reports"), ("DELETE", "/v1/samples"), ("POST", "/"), ("POST", "/page/index.html")],
)
def test_a_wrong_method_is_a_problem(client: TestClient, method: str, path: str) -> None:
    expect.answer(client.request(method, path), expected=405, code="method-not-allowed")


def test_a_fault_of_the_program_is_a_problem_that_tells_nothing_of_it() -> None:
    app = FastAPI()
    problems.install(app)

    @app.get("/fault")
    async def fault() -> None:
        raise RuntimeError("a secret path")

    response = TestClient(app, raise_server_exceptions=False).get("/fault")
    assert "secret" not in expect.answer(response, expected=500, code="internal")["detail"]


def test_a_lost_worker_is_503_and_the_service_goes_on() -> None:
    with TestClient(create_app(apart(), task=obey)) as service:
        lost = service.post("/v1/reports", content=b"die")
        expect.answer(lost, expected=503, code="worker-lost")
        assert lost.headers["retry-after"] == "1"
        assert service.post("/v1/reports", content=b"speed").content == b"SPEED"
        told = service.post("/v1/reports?Ms=1.4", content=b"refuse")
        assert expect.answer(told, expected=422, code="refused-by-test")["evidence"] == {"Ms": 1.4}
        assert "gainwright_workers_replaced 1.0" in service.get("/metrics").text
        assert 'gainwright_analyses_total{outcome="worker-lost"} 1.0' in service.get("/metrics").text


def test_a_full_queue_is_503_with_a_time_to_come_back() -> None:
    app = create_app(apart(max_waiting=0), task=obey)
    with TestClient(app) as service, app.state.shared.workers.admit():
        response = service.post("/v1/reports", content=b"a")
        expect.answer(response, expected=503, code="busy")
        assert response.headers["retry-after"] == "5"
