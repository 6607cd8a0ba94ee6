"""One service for all tests: in this process (`client`), and as its users run it (`served`)."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest
from starlette.testclient import TestClient

from service.app import create_app
from service.settings import Settings

ROOT = Path(__file__).resolve().parents[2]
SCRATCH = tempfile.TemporaryDirectory(prefix="gainwright-tests-", ignore_cleanup_errors=True)


@dataclass(frozen=True)
class Served:
    """A service in a process of its own."""

    process: subprocess.Popen[str]
    host: str
    port: int


def own_folder() -> Path:
    """A new folder for one service's data, removed at the end."""
    return Path(tempfile.mkdtemp(prefix="data-", dir=SCRATCH.name))


def apart(**settings: Any) -> Settings:
    """Settings of a service in this process, with a folder of its own: no two services share one."""
    return Settings(**{"workers": 1, "data_dir": own_folder(), **settings})


def start_served(**settings: str) -> Served:
    """`gainwright serve` on a free port, with a folder of its own; the line it prints says which port."""
    settings.setdefault("data_dir", str(own_folder()))
    environment = {**os.environ, **{f"GAINWRIGHT_{k.upper()}": v for k, v in settings.items()}}
    process = subprocess.Popen(
        [sys.executable, "-m", "service.cli", "serve", "--port", "0"],
        cwd=ROOT,
        env=environment,
        stdout=subprocess.PIPE,
        text=True,
    )
    assert process.stdout is not None
    line = process.stdout.readline()
    assert "http://127.0.0.1:" in line, f"no address in {line!r}"
    return Served(process, "127.0.0.1", int(line.split("http://127.0.0.1:")[1].split("/")[0]))


@pytest.fixture(scope="session")
def client() -> Iterator[TestClient]:
    with TestClient(create_app(apart()), raise_server_exceptions=False) as client:
        yield client


@pytest.fixture(scope="session")
def served() -> Iterator[Served]:
    served = start_served(workers="1")
    yield served
    served.process.terminate()
    served.process.communicate(timeout=30)


@pytest.fixture(scope="session")
def step_test() -> bytes:
    return (ROOT / "sample_logs" / "step_test.csv").read_bytes()
