"""An analysis on its way: stages, lost workers, stops and restarts, how long a request waits."""

from __future__ import annotations

import json
import time
from datetime import datetime, timedelta
from pathlib import Path

import pytest
from conftest import apart, own_folder
from keeping import keep
from lane_tasks import obey
from starlette.testclient import TestClient

from service.api.prefer import LONGEST_S, wait_seconds
from service.app import create_app
from service.store.jobs import Job, Jobs
from service.work.stages import STAGES


def test_a_log_that_kills_its_worker_has_failed_after_three_attempts_and_may_try_again() -> None:
    with TestClient(create_app(apart(), task=obey)) as service:
        failed = keep(service, b"die")
        assert (failed["status"], failed["problem"]["code"]) == ("failed", "cut-off")
        # A process after each of the first two; the third is replaced when there is something to do.
        assert "gainwright_workers_replaced 2.0" in service.get("/metrics").text
        refused = keep(service, b"refuse")
        assert refused["problem"]["code"] == "refused-by-test"
        assert refused["problem"]["evidence"] == {"Ms": 1.6}
        again = service.post("/v1/loops/pan/logs", content=b"die")
        assert (again.status_code, again.json()["id"]) == (200, failed["id"])
        assert again.json()["status"] in {"queued", "running"}


def test_the_stage_is_the_worker_s_own_word() -> None:
    with TestClient(create_app(apart(), task=obey)) as service:
        told = service.post("/v1/loops/pan/logs", content=b"fitting").json()
        end = time.monotonic() + 20
        while told["stage"] != "fitting" and time.monotonic() < end:
            time.sleep(0.05)
            told = service.get(f"/v1/analyses/{told['id']}").json()
        assert (told["status"], told["stage"], told["progress"]) == ("running", "fitting", 0.2)
        # Waiting ends when the time is up, and says how it stands.
        begun = time.monotonic()
        waited = service.post("/v1/loops/pan/logs", content=b"fitting", headers={"Prefer": "wait=1"})
        assert 0.9 < time.monotonic() - begun < 20
        assert (waited.status_code, waited.json()["status"]) == (200, "running")
        assert waited.headers["preference-applied"] == "wait=1"


def test_the_stages_of_a_log_come_in_order_and_end_with_storing(
    service: TestClient, step_test: bytes, monkeypatch: pytest.MonkeyPatch
) -> None:
    told: list[tuple[str, float]] = []
    renew = Jobs.renew

    def listen(jobs: Jobs, job: Job, stage: str, progress: float, now: datetime, lease: timedelta) -> bool:
        told.append((stage, progress))
        return renew(jobs, job, stage, progress, now, lease)

    monkeypatch.setattr(Jobs, "renew", listen)
    ended = keep(service, step_test, "stages")
    assert (ended["stage"], ended["progress"]) == ("done", 1.0)
    # A quick worker passes some of them between two looks.
    assert told == sorted(told, key=lambda one: STAGES.index(one[0]))
    assert [share for _, share in told] == sorted(share for _, share in told)
    assert told[-1] == ("storing", 0.8)


def test_a_stop_in_order_leaves_the_rest_for_the_next_start(step_test: bytes) -> None:
    folder = own_folder()
    with TestClient(create_app(apart(data_dir=folder), task=obey)) as service:
        hung = service.post("/v1/loops/pan/logs", content=b"hang").json()
        waiting = service.post("/v1/loops/pan/logs", content=step_test).json()
        end = time.monotonic() + 20
        while service.get(f"/v1/analyses/{hung['id']}").json()["status"] != "running" and time.monotonic() < end:
            time.sleep(0.05)
        assert service.get(f"/v1/analyses/{hung['id']}").json()["stage"] == "reading"
        assert service.get(f"/v1/analyses/{waiting['id']}").json()["status"] == "queued"
    with TestClient(create_app(apart(data_dir=folder))) as service:
        # To the real thing b"hang" is no log.
        ended = keep(service, b"hang", expected=200)
        assert (ended["id"], ended["status"]) == (hung["id"], "failed")
        assert keep(service, step_test, expected=200)["status"] == "done"


def test_settings_and_logs_survive_a_restart(step_test: bytes) -> None:
    folder: Path = own_folder()
    with TestClient(create_app(apart(data_dir=folder))) as service:
        service.put("/v1/loops/pan", json={"zone": "UTC"})
        kept = keep(service, step_test)
        body = service.get(f"/v1/reports/{kept['report_id']}").content
    with TestClient(create_app(apart(data_dir=folder))) as service:
        assert service.get("/v1/loops/pan").json()["zone"] == "UTC"
        assert service.get(f"/v1/reports/{kept['report_id']}").content == body
        assert keep(service, step_test, expected=200) == kept
        assert json.loads(body)["log"]["sha256"] == service.get("/v1/loops/pan/logs").json()[0]["sha256"]


@pytest.mark.parametrize(
    ("headers", "seconds"),
    [
        ([], None),
        (["wait=5"], 5),
        (["respond-async, WAIT=10"], 10),
        (["respond-async", 'wait="7"; x=1'], 7),
        (["wait=2, wait=9"], 2),
        (["wait=99999"], LONGEST_S),
        (["wait"], None),
        (["wait=-1"], None),
        (["wait=1.5"], None),
        (["waiting=3"], None),
    ],
)
def test_preferences_are_read_as_rfc_7240_has_them(headers: list[str], seconds: int | None) -> None:
    assert wait_seconds(headers) == seconds
