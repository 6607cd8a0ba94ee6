"""The command `gainwright`, as it is typed."""

from __future__ import annotations

import os
import socket
import subprocess
import sys
from pathlib import Path

import pytest
from conftest import ROOT, own_folder
from starlette.testclient import TestClient

from service.cli import main
from service.serve import address
from service.store import Store
from service.work.options import Options

SAMPLE = ROOT / "sample_logs" / "step_test.csv"


def gainwright(*arguments: str, **environment: str) -> subprocess.CompletedProcess[bytes]:
    return subprocess.run(
        [sys.executable, "-m", "service.cli", *arguments],
        cwd=ROOT,
        env={**os.environ, "GAINWRIGHT_DATA_DIR": str(own_folder()), **environment},
        capture_output=True,
        timeout=120,
    )


@pytest.mark.parametrize(
    ("arguments", "query"),
    [
        ([], ""),
        (["--Ms", "1.4", "--period", "0"], "?Ms=1.4&period=0"),
        (["--time", "0", "--command=1", "--speed=speed [rpm]"], "?time=0&command=1&speed=speed%20%5Brpm%5D"),
    ],
)
def test_it_prints_the_bytes_that_http_sends(
    client: TestClient, step_test: bytes, arguments: list[str], query: str
) -> None:
    sent = client.post(f"/v1/reports{query}", content=step_test)
    assert sent.status_code == 200, sent.text
    printed = gainwright("report", str(SAMPLE), *arguments)
    assert printed.stderr == b""
    assert printed.returncode == 0
    assert printed.stdout == sent.content


def test_the_summary_is_for_reading() -> None:
    printed = gainwright("report", str(SAMPLE), "--summary")
    assert printed.returncode == 0
    text = printed.stdout.decode()
    assert not text.startswith("{")
    assert "Kp" in text
    assert "Ti" in text


def test_help_names_every_option_and_says_what_it_is_for() -> None:
    text = gainwright("report", "--help").stdout.decode()
    for name in Options.model_fields:
        assert f"--{name.replace('_', '-')}" in text
    for word in ("seconds", "Time zone", "header", "fopdt|sopdt|arx|auto", "--summary"):
        assert word in text


def test_help_and_version_need_no_command() -> None:
    assert b"serve" in gainwright("--help").stdout
    assert gainwright("--version").stdout.startswith(b"gainwright ")


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["report", "no/such/file.csv"], "no/such/file.csv cannot be opened"),
        (["report", str(SAMPLE), "--Ms", "0.5"], "Ms: Input should be greater than 1"),
        (["report", str(SAMPLE), "--model", "best"], "code: invalid-option"),
        (["serve", "--port", "high"], "GAINWRIGHT_PORT"),
        ([], "usage"),
    ],
)
def test_what_cannot_be_used_is_said_on_standard_error(
    capsys: pytest.CaptureFixture[str], arguments: list[str], said: str
) -> None:
    try:
        status: int | str | None = main(arguments)
    except SystemExit as ended:
        status = ended.code  # argparse's way
    told = capsys.readouterr()
    assert status == 2
    assert told.out == ""
    assert said in told.err
    assert "Traceback" not in told.err


def test_a_port_in_use_is_said_and_ends_in_failure() -> None:
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        told = gainwright("serve", "--port", str(taken.getsockname()[1]))
    assert told.returncode == 1
    assert "address already in use" in told.stderr.decode()
    assert told.stdout == b""


def test_a_folder_in_use_is_said_in_a_sentence_and_ends_in_failure(tmp_path: Path) -> None:
    store = Store(tmp_path)
    store.open()
    try:
        told = gainwright("serve", "--port", "0", GAINWRIGHT_DATA_DIR=str(tmp_path))
    finally:
        store.close()
    assert (told.returncode, told.stdout) == (1, b"")
    assert b"code: data-in-use" in told.stderr
    assert b"Traceback" not in told.stderr


def test_numpy_comes_after_the_thread_limit() -> None:
    """Importing the command must not bring numpy along, or the limit of one BLAS thread comes too late."""
    code = "import service.cli, sys; sys.exit('numpy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], cwd=ROOT, timeout=60).returncode == 0


def test_the_address_is_one_that_a_browser_takes() -> None:
    assert address("127.0.0.1", 8000) == "http://127.0.0.1:8000/"
    assert address("0.0.0.0", 8000) == "http://127.0.0.1:8000/"
    assert address("::1", 8000) == "http://[::1]:8000/"
