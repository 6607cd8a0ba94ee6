"""What a log is understood as, on the command line and over HTTP; and logs packed as zstd."""

from __future__ import annotations

import json
from pathlib import Path

import expect
import pytest
import zstandard
from starlette.testclient import TestClient

from service.cli import main
from service.work.options import Options
from service.work.previewing import preview_bytes

# A German export: semicolons, decimal commas, a preamble, two rows of bad quality.
ODD = (
    "Anlage;Walzwerk 3\r\nExport;17.11.2026\r\n\r\n"
    "Zeit;Sollwert [U/min];Stellgröße [%];Drehzahl [U/min];Qualität\r\n"
    + "".join(
        f"17.11.2026 06:00:{k:02d},000;600,0;{40 + k % 7},5;{598 + k % 5},25;{'Bad' if k in (9, 10) else 'Good'}\r\n"
        for k in range(60)
    )
).encode("cp1252")

NO_LOG = preview_bytes(b"no log", Options()).code  # type: ignore[union-attr]


def test_an_odd_export_is_shown_before_it_is_used(client: TestClient) -> None:
    answer = client.post("/v1/logs/preview?zone=Europe/Berlin", content=ODD)
    assert answer.status_code == 200, answer.text
    seen = answer.json()
    assert {c["role"]: c["header"] for c in seen["columns"]}["speed"].startswith("Drehzahl")
    assert (seen["delimiter"], seen["decimal"], seen["encoding"]) == (";", ",", "cp1252")
    assert seen["rows"] == 60
    assert sum(seen["dropped"].values()) == 2
    assert seen["start"] == "2026-11-17T05:00:00Z"
    assert seen["sample_time_s"] == pytest.approx(1.0)
    assert answer.content == preview_bytes(ODD, Options(zone="Europe/Berlin"))


def test_nothing_is_fitted_for_a_preview(client: TestClient) -> None:
    still = b"time,command,speed\n" + b"".join(b"%d,40,600\n" % k for k in range(50))
    assert client.post("/v1/logs/preview", content=still).status_code == 200
    expect.answer(client.post("/v1/logs/preview", content=b"no log"), expected=422, code=NO_LOG)


def test_the_command_prints_the_same(tmp_path: Path, capfdbinary: pytest.CaptureFixture[bytes]) -> None:
    log = tmp_path / "odd.csv"
    log.write_bytes(ODD)
    assert main(["preview", str(log), "--zone", "Europe/Berlin"]) == 0
    printed = json.loads(capfdbinary.readouterr().out)
    assert printed == json.loads(preview_bytes(ODD, Options(zone="Europe/Berlin")))  # type: ignore[arg-type]


def zstd(*parts: bytes) -> bytes:
    """One frame a part, packed by the zstandard package."""
    return b"".join(zstandard.compress(part) for part in parts)


def test_plain_and_zstd_give_the_same_answer(client: TestClient) -> None:
    plain = client.post("/v1/logs/preview?zone=UTC", content=ODD)
    for packed in (zstd(ODD), zstd(ODD[:700], ODD[700:])):
        answer = client.post("/v1/logs/preview?zone=UTC", content=packed, headers={"Content-Encoding": "zstd"})
        assert answer.json() == plain.json()


@pytest.mark.parametrize(
    ("body", "code", "status"),
    [
        (ODD, "broken-zstd", 400),
        (zstd(ODD)[:-20], "broken-zstd", 400),
        (zstd(bytes(2**30)), "too-large", 413),  # a bomb: 1 GiB of zeros in some tens of kilobytes
    ],
    ids=["not zstd", "cut short", "bomb"],
)
def test_bad_zstd_is_refused(client: TestClient, body: bytes, code: str, status: int) -> None:
    answer = client.post("/v1/logs/preview", content=body, headers={"Content-Encoding": "zstd"})
    expect.answer(answer, expected=status, code=code)
