"""What is no log: each kind has its own code and a sentence that says what to do, and the service goes on.

The list is the issue's. The same refusals reach the command, with exit status 2.
"""

from __future__ import annotations

import struct
import zlib
from pathlib import Path

import expect
import pytest
from starlette.testclient import TestClient

from service.cli import main


def picture() -> bytes:
    """A PNG of one grey pixel (ISO/IEC 15948)."""

    def chunk(kind: bytes, data: bytes) -> bytes:
        return struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data))

    header = struct.pack(">IIBBBBB", 1, 1, 8, 0, 0, 0, 0)
    pixels = zlib.compress(b"\0\x80")
    return b"\x89PNG\r\n\x1a\n" + chunk(b"IHDR", header) + chunk(b"IDAT", pixels) + chunk(b"IEND", b"")


def log(rows: int, command: str = "1.0", last_speed: str = "10.0") -> bytes:
    lines = [f"{0.1 * i:.1f},{command},10.0" for i in range(rows - 1)]
    return "\n".join(
        ["time [s],command [%],speed [rpm]", *lines, f"{0.1 * (rows - 1):.1f},{command},{last_speed}", ""]
    ).encode()


BAD = {
    "empty body": (b"", "empty-log"),
    "picture": (picture(), "not-text"),
    "one column": (b"speed\n" + b"1.5\n" * 50, "one-column"),
    "three rows": (log(3), "too-few-rows"),
    "infinite numbers": (log(50, last_speed="inf"), "not-finite"),
}


@pytest.mark.parametrize(("body", "code"), BAD.values(), ids=BAD)
def test_each_kind_has_its_own_problem_and_the_service_goes_on(client: TestClient, body: bytes, code: str) -> None:
    expect.answer(client.post("/v1/reports", content=body), expected=422, code=code)
    assert client.get("/readyz").status_code == 200


def test_the_codes_are_all_different() -> None:
    codes = [code for _, code in BAD.values()]
    assert len(set(codes)) == len(codes)


def test_a_constant_command_is_a_report_that_says_so(client: TestClient) -> None:
    response = client.post("/v1/reports", content=log(500))
    assert response.status_code == 200, response.text
    report = response.json()
    assert report["record"]["excitation"]["sufficient"] is False
    assert report["record"]["excitation"]["reason"]
    assert (report["fits"], report["selected"], report["recommended"]) == ([], None, None)
    assert report["tunings"] == []


@pytest.mark.parametrize(("body", "code"), BAD.values(), ids=BAD)
def test_the_command_says_the_same(
    client: TestClient, tmp_path: Path, capsys: pytest.CaptureFixture[str], body: bytes, code: str
) -> None:
    file = tmp_path / "log.csv"
    file.write_bytes(body)
    assert main(["report", str(file)]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert f"code: {code}" in said.err
    assert client.post("/v1/reports", content=body).json()["detail"] in said.err
