"""A loop that the page shows: the sample nights whose gain falls; and the service without the page."""

from __future__ import annotations

import json
import urllib.request
from typing import Any
from urllib.parse import quote

from conftest import ROOT, Served

NIGHTS = [path.read_bytes() for path in sorted((ROOT / "sample_logs" / "nights").glob("*.csv"))]
PAN = "almond pan / 1".replace("/", "№")  # a space and a letter of another script: addresses must carry both
BASELINE, FALLEN = 3, 7  # nights in the baseline; the first night after the gain has fallen (sample_logs/README.md)
INSTALLED = {"Kp": 0.075, "Ti": 2.3}  # of sample_logs/README.md


class Api:
    """The service without the page."""

    def __init__(self, served: Served) -> None:
        self.base = f"http://{served.host}:{served.port}/v1"

    def __call__(self, method: str, path: str, body: Any = None) -> Any:
        raw = isinstance(body, bytes)
        data = body if raw or body is None else json.dumps(body).encode()
        headers = {"Content-Type": "text/csv" if raw else "application/json", "Prefer": "wait=60"}
        with urllib.request.urlopen(urllib.request.Request(self.base + path, data, headers, method=method)) as answer:
            return json.load(answer)

    def loop(self, name: str) -> str:
        return f"/loops/{quote(name, safe='')}"


def here(name: str) -> str:
    """The page's address of a loop."""
    return f"/#/loops/{quote(name, safe='')}"


def watch(api: Api) -> list[dict[str, Any]]:
    """The loop PAN: three nights of baseline, one like them, one with the gain fallen; its history."""
    loop = api.loop(PAN)
    api("PUT", loop, {"installed": INSTALLED, "period": 0.1})
    for log in (*NIGHTS[: BASELINE + 1], NIGHTS[FALLEN]):
        assert api("POST", f"{loop}/logs", log)["status"] == "done"
    rows: list[dict[str, Any]] = api("GET", f"{loop}/history")
    api("PUT", f"{loop}/baseline", {"report_ids": [row["report_id"] for row in rows[:BASELINE]]})
    history: list[dict[str, Any]] = api("GET", f"{loop}/history")
    return history
