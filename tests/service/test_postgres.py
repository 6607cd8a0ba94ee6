"""The same store on PostgreSQL: run with an empty database named by GAINWRIGHT_TEST_DATABASE_URL."""

from __future__ import annotations

import os
import threading
from collections.abc import Iterator
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest
from alembic import command
from alembic.autogenerate import compare_metadata
from alembic.runtime.migration import MigrationContext
from conftest import apart
from starlette.testclient import TestClient

from service.app import create_app
from service.errors import Problem
from service.store import Store
from service.store import tables as t
from service.store.database import Database, alembic_config

URL = os.environ.get("GAINWRIGHT_TEST_DATABASE_URL")
NOW = datetime(2026, 11, 17, 6, 40, tzinfo=UTC)
LEASE = timedelta(seconds=60)

# A user's machine has no server to test with; CI must have one.
pytestmark = pytest.mark.skipif(
    URL is None and os.environ.get("CI") != "true", reason="GAINWRIGHT_TEST_DATABASE_URL names no database to test with"
)


@pytest.fixture
def url() -> Iterator[str]:
    assert URL is not None, "CI needs GAINWRIGHT_TEST_DATABASE_URL"
    yield URL
    database = Database(URL)
    with database.write() as connection:
        command.downgrade(alembic_config(connection), "base")
    database.close()


def test_the_migrations_end_at_the_tables(url: str) -> None:
    database = Database(url)
    with database.read() as connection:
        context = MigrationContext.configure(connection, opts={"compare_type": True})
        assert compare_metadata(context, t.metadata) == []
    database.close()


def test_a_job_is_claimed_once_however_many_ask(url: str, tmp_path: Path) -> None:
    store = Store(tmp_path, url)
    store.open()
    assert not store.alone
    for i in range(40):
        (log := tmp_path / "log").write_text(str(i))
        sha256 = store.uploads.put(log)
        store.logs.accept("pan", sha256, 1, "{}", NOW, loop_settings="{}")
    claimed: list[str] = []

    def work(owner: str) -> None:
        while (job := store.jobs.claim(owner, "reading", NOW, LEASE)) is not None:
            claimed.append(job.id)
            store.jobs.finish(job, Problem("tried", "It was tried."), NOW)

    threads = [threading.Thread(target=work, args=(f"owner {i}",)) for i in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(claimed) == len(set(claimed)) == 40
    store.close()


def test_the_whole_way(url: str, step_test: bytes) -> None:
    with TestClient(create_app(apart(database_url=url))) as service:
        wait = {"Prefer": "wait=60"}
        told = service.post("/v1/loops/R%C3%BChrwerk/logs", content=step_test, headers=wait)
        assert (told.status_code, told.json()["status"]) == (201, "done")
        assert service.post("/v1/loops/R%C3%BChrwerk/logs", content=step_test, headers=wait).status_code == 200
        report = told.json()["report_id"]
        assert service.get(f"/v1/reports/{report}").content == service.post("/v1/reports", content=step_test).content
        (row,) = service.get("/v1/loops/R%C3%BChrwerk/history").json()
        assert (row["report_id"], row["start"]) == (report, "2026-11-17T05:40:00Z")
        assert service.get(f"/v1/loops/R%C3%BChrwerk/history?after={report}").json() == []
        assert service.put("/v1/loops/R%C3%BChrwerk/baseline", json={"report_ids": [report]}).status_code == 200
        assert service.get("/v1/loops/R%C3%BChrwerk/drift").json()["verdict"] == "no-news"
