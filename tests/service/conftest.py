"""One service for all tests: in this process (`client`), as its users run it (`served`), and in a browser (`visit`)."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest
from starlette.testclient import TestClient

from service.app import create_app
from service.settings import Settings

if TYPE_CHECKING:
    # They import from this file, so it imports them late.
    from browsing import Visit
    from playwright.sync_api import Browser
    from watched_loop import Api

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


@pytest.fixture
def service() -> Iterator[TestClient]:
    """One that has seen nothing yet; a module whose tests share theirs has a fixture of its own."""
    with TestClient(create_app(apart())) as service:
        yield service


@pytest.fixture(scope="session")
def served() -> Iterator[Served]:
    served = start_served(workers="1")
    yield served
    served.process.terminate()
    served.process.communicate(timeout=30)


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    from browsing import chromium

    with chromium() as browser:
        yield browser


@pytest.fixture
def visit(browser: Browser, served: Served) -> Iterator[Callable[..., Visit]]:
    from browsing import visitor

    with visitor(browser, served) as visit:
        yield visit


@pytest.fixture(scope="session")
def api(served: Served) -> Api:
    from watched_loop import Api

    return Api(served)


@pytest.fixture(scope="session")
def pan(api: Api) -> list[dict[str, Any]]:
    """A loop whose gain has fallen on its last night, watched; its history."""
    from watched_loop import watch

    return watch(api)


@pytest.fixture(scope="session")
def step_test() -> bytes:
    return (ROOT / "sample_logs" / "step_test.csv").read_bytes()
