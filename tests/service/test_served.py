"""The service as its users run it: a process, a socket, a body that is too long, a kill."""

from __future__ import annotations

import http.client
import os
import signal
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import expect
import pytest
from conftest import Served, start_served

MEGABYTE = b"0.1,0.2,0.3\n" * (1_000_000 // 12)

linux = pytest.mark.skipif(sys.platform != "linux", reason="reads /proc")


def post(served: Served, body: Iterator[bytes] | bytes, **headers: str) -> tuple[int, dict[str, str], bytes]:
    connection = http.client.HTTPConnection(served.host, served.port, timeout=60)
    try:
        connection.request("POST", "/v1/reports", body, headers)
        response = connection.getresponse()
        return response.status, {k.lower(): v for k, v in response.getheaders()}, response.read()
    finally:
        connection.close()


@linux
def test_a_stream_of_300_mb_is_refused_in_words_and_not_kept(served: Served) -> None:
    limit = 200 * 2**20
    before = peak(served.process.pid)
    told = expect.problem(*post(served, (MEGABYTE for _ in range(301))), expected=413, code="too-large")
    assert told["evidence"]["limit_bytes"] == limit
    # What came before the limit was passed had to be held; nothing beyond it.
    assert peak(served.process.pid) - before < 1.3 * limit
    status, _, _ = post(served, b"")
    assert status == 422


@linux
def test_an_announced_300_mb_is_refused_without_holding_any() -> None:
    small = start_served(workers="1")
    try:
        before = peak(small.process.pid)
        size = str(301 * len(MEGABYTE))
        answer = post(small, (MEGABYTE for _ in range(301)), **{"Content-Length": size})
        expect.problem(*answer, expected=413, code="too-large")
        assert peak(small.process.pid) - before < 20e6
    finally:
        small.process.terminate()
        small.process.communicate(timeout=30)


def test_a_client_that_asks_first_need_not_send(served: Served) -> None:
    connection = http.client.HTTPConnection(served.host, served.port, timeout=10)
    connection.putrequest("POST", "/v1/reports")
    connection.putheader("Content-Length", str(10**10))
    connection.putheader("Expect", "100-continue")
    connection.endheaders()
    response = connection.getresponse()
    assert response.status == 413
    connection.close()


def test_an_upload_that_stalls_gives_its_place_up() -> None:
    served = start_served(workers="1", upload_time_limit_s="0.5")
    try:
        connection = http.client.HTTPConnection(served.host, served.port, timeout=30)
        connection.putrequest("POST", "/v1/reports")
        connection.putheader("Content-Length", "1000")
        connection.endheaders(b"time,command,speed")
        response = connection.getresponse()
        headers = {k.lower(): v for k, v in response.getheaders()}
        expect.problem(response.status, headers, response.read(), expected=408, code="too-slow")
        connection.close()
    finally:
        served.process.terminate()
        served.process.communicate(timeout=30)


def test_a_body_sent_to_nowhere_still_gets_its_answer(served: Served) -> None:
    connection = http.client.HTTPConnection(served.host, served.port, timeout=30)
    connection.request("POST", "/v1/nowhere", MEGABYTE * 20)
    assert connection.getresponse().status == 404
    connection.close()


@linux
def test_killed_outright_it_leaves_no_process_behind() -> None:
    served = start_served(workers="2")
    family = descendants(served.process.pid)
    assert len(family) >= 3  # the fork server and two workers
    os.kill(served.process.pid, signal.SIGKILL)
    served.process.communicate(timeout=30)
    end = time.monotonic() + 10
    while (left := [pid for pid in family if alive(pid)]) and time.monotonic() < end:
        time.sleep(0.1)
    assert left == []


@linux
def test_stopped_politely_it_says_nothing_more_and_ends_well() -> None:
    served = start_served(workers="1")
    family = descendants(served.process.pid)
    served.process.send_signal(signal.SIGINT)
    output, _ = served.process.communicate(timeout=30)
    assert output == ""
    assert served.process.returncode == 0
    time.sleep(0.5)
    assert [pid for pid in family if alive(pid)] == []


def peak(pid: int) -> int:
    """Most memory the process has held so far, in bytes."""
    status = Path(f"/proc/{pid}/status").read_text()
    (line,) = [line for line in status.splitlines() if line.startswith("VmHWM")]
    return int(line.split()[1]) * 1024


def descendants(pid: int) -> list[int]:
    children = Path(f"/proc/{pid}/task/{pid}/children")
    found = [int(child) for task in children.parents[1].glob("*/children") for child in task.read_text().split()]
    return found + [deeper for child in found for deeper in descendants(child)]


def alive(pid: int) -> bool:
    try:
        state = Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0]
    except FileNotFoundError:
        return False
    return state != "Z"
