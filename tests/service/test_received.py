"""A log is received into a file: memory does not grow with it, and nothing of it stays behind."""

from __future__ import annotations

import asyncio
import gzip
import tracemalloc
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
import zstandard
from conftest import apart
from starlette.requests import Request
from starlette.testclient import TestClient

from service.api.body import receive
from service.app import create_app
from service.errors import ProblemError
from service.store.uploads import Uploads

PIECE = b"2026-11-17T06:40:00.000Z,900.0,42.13,591.5\n" * 1500  # 64,500 bytes, as a server hands them on
PIECES = 1000
BOUND = 12 * 2**20  # bytes; the log is five times that
HEAD = b'--x\r\nContent-Disposition: form-data; name="file"; filename="log.csv"\r\n\r\n'


def packed_by(packer: Any) -> list[bytes]:
    return [packer.compress(PIECE) for _ in range(PIECES)] + [packer.flush()]


def sent(how: str) -> tuple[dict[str, str], list[bytes]]:
    """Headers and pieces of one log, in each way that it may come."""
    if how == "gzip":
        whole = gzip.compress(PIECE * PIECES)
        return {"content-encoding": "gzip"}, [whole[k : k + 65536] for k in range(0, len(whole), 65536)]
    if how == "zstd":
        return {"content-encoding": "zstd"}, packed_by(zstandard.ZstdCompressor().compressobj())
    if how == "form":
        return {"content-type": "multipart/form-data; boundary=x"}, [HEAD, *[PIECE] * PIECES, b"\r\n--x--\r\n"]
    return {}, [PIECE] * PIECES


def request(headers: dict[str, str], pieces: list[bytes]) -> Request:
    left = iter(pieces)

    async def receive() -> dict[str, Any]:
        body = next(left, None)
        return {"type": "http.request", "body": body or b"", "more_body": body is not None}

    raw = [(name.encode(), value.encode()) for name, value in headers.items()]
    return Request({"type": "http", "method": "POST", "path": "/", "headers": raw, "query_string": b""}, receive)


def peak(task: Callable[[], object]) -> int:
    """Most bytes held at once in the course of a task."""
    tracemalloc.start()
    try:
        task()
        return tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()


@pytest.mark.parametrize("how", ["plain", "gzip", "zstd", "form"])
def test_a_large_log_is_never_in_memory_whole(how: str, tmp_path: Path) -> None:
    log, asked = tmp_path / "log", request(*sent(how))
    assert peak(lambda: asyncio.run(receive(asked, log, 10**9, 60.0))) < BOUND
    assert log.stat().st_size == len(PIECE) * PIECES
    with log.open("rb") as file:
        assert all(file.read(len(PIECE)) == PIECE for _ in range(PIECES))


def test_a_bomb_is_stopped_while_it_unpacks(tmp_path: Path) -> None:
    log, asked = tmp_path / "log", request(*sent("zstd"))
    with pytest.raises(ProblemError, match="too-large"):
        asyncio.run(receive(asked, log, 1_000_000, 60.0))
    assert log.stat().st_size <= 1_000_000


def test_keeping_and_reading_a_kept_log_holds_little_of_it(tmp_path: Path) -> None:
    uploads, log, again = Uploads(tmp_path / "uploads"), tmp_path / "log", tmp_path / "again"
    with log.open("wb") as file:
        file.writelines(PIECE for _ in range(PIECES))
    assert peak(lambda: uploads.get(uploads.put(log), again)) < BOUND
    assert again.read_bytes() == log.read_bytes()


def test_nothing_of_a_log_stays_behind_whatever_came_of_it(tmp_path: Path, step_test: bytes) -> None:
    with TestClient(create_app(apart(data_dir=tmp_path, max_upload_bytes=len(step_test)))) as client:
        answers = [
            client.post("/v1/reports", content=step_test),
            client.post("/v1/logs/preview", content=b"speed\n1\n2\n"),
            client.post("/v1/reports", content=step_test + b"0"),
            client.post("/v1/reports", content=b"no zstd", headers={"Content-Encoding": "zstd"}),
            client.post("/v1/loops/pan/logs", content=step_test, headers={"Prefer": "wait=60"}),
        ]
        assert [a.status_code for a in answers] == [200, 422, 413, 400, 201]
        assert not list((tmp_path / "uploads" / "parts").iterdir())
