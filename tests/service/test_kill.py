"""kill -9 in the middle of twenty uploads: what was answered is there once, and ends."""

from __future__ import annotations

import http.client
import json
import os
import signal
import sqlite3
import threading
import time
from contextlib import closing
from pathlib import Path
from typing import Any

from conftest import Served, own_folder, start_served

from service.store.store import FILE

UPLOADS = 20


def logs(step_test: bytes) -> list[bytes]:
    """Twenty different logs, one of them no log at all."""
    return [step_test.replace(b"2026-11-17", b"2026-11-%02d" % (1 + i)) for i in range(UPLOADS - 1)] + [b"no log"]


def ask(served: Served, method: str, path: str, body: bytes | None = None) -> tuple[int, Any]:
    connection = http.client.HTTPConnection(served.host, served.port, timeout=60)
    try:
        connection.request(method, path, body, {"Content-Type": "text/csv"})
        response = connection.getresponse()
        return response.status, json.loads(response.read())
    finally:
        connection.close()


def outstanding(folder: str) -> int:
    """Analyses in the database that have not ended."""
    with closing(sqlite3.connect(Path(folder) / FILE)) as database:
        (count,) = database.execute("SELECT count(*) FROM analyses WHERE status IN ('queued', 'running')").fetchone()
        return int(count)


def test_nothing_that_was_accepted_is_lost_or_doubled(step_test: bytes) -> None:
    folder = str(own_folder())
    served = start_served(workers="2", max_waiting="30", data_dir=folder)
    accepted: list[dict[str, Any]] = []
    enough = threading.Event()

    def post(body: bytes) -> None:
        try:
            status, told = ask(served, "POST", "/v1/loops/pan/logs", body)
        except (OSError, http.client.HTTPException, json.JSONDecodeError):
            return  # never answered
        assert status in {200, 201, 202}, told
        accepted.append(told)
        if len(accepted) >= UPLOADS // 3:
            enough.set()

    threads = [threading.Thread(target=post, args=(body,)) for body in logs(step_test)]
    for thread in threads:
        thread.start()
    assert enough.wait(60)
    os.kill(served.process.pid, signal.SIGKILL)
    for thread in threads:
        thread.join()
    served.process.communicate(timeout=30)
    assert outstanding(folder) > 0

    again = start_served(workers="2", data_dir=folder)  # the lock went with the process that held it
    try:
        end = time.monotonic() + 120
        while True:
            _, kept = ask(again, "GET", "/v1/loops/pan/logs?limit=1000")
            analyses = [analysis for log in kept for analysis in log["analyses"]]
            if all(a["status"] in {"done", "failed"} for a in analyses) or time.monotonic() > end:
                break
            time.sleep(0.1)
        assert len({log["sha256"] for log in kept}) == len(kept)
        assert all(len(log["analyses"]) == 1 for log in kept)
        by_id = {analysis["id"]: analysis for analysis in analyses}
        assert {told["id"] for told in accepted} <= set(by_id)
        for analysis in analyses:
            assert analysis["status"] == "done" or analysis["problem"]["detail"], analysis
        done = [analysis["report_id"] for analysis in analyses if analysis["status"] == "done"]
        _, history = ask(again, "GET", "/v1/loops/pan/history")
        assert sorted(row["report_id"] for row in history) == sorted(done)
        # Whoever was not answered sends again; then all are there, once.
        for body in logs(step_test):
            status, _ = ask(again, "POST", "/v1/loops/pan/logs", body)
            assert status in {200, 202}
        _, kept = ask(again, "GET", "/v1/loops/pan/logs?limit=1000")
        assert len(kept) == UPLOADS
    finally:
        again.process.terminate()
        again.process.communicate(timeout=30)
