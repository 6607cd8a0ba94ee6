"""A browser that visits the page, with everything that went on behind it."""

from __future__ import annotations

import os
import re
import shutil
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import Any

import pytest
from conftest import Served
from playwright.sync_api import Browser, FilePayload, Page, expect, sync_playwright

WIDE, NARROW = {"width": 1440, "height": 900}, {"width": 390, "height": 844}
REPORT_MS = 60_000  # a slow machine under load; the page itself is quick


@dataclass
class Visit:
    """A page with everything that went on behind it."""

    page: Page
    base: str
    requests: list[str] = field(default_factory=list)
    complaints: list[str] = field(default_factory=list)

    def bring(self, name: str, body: bytes) -> None:
        file: FilePayload = {"name": name, "mimeType": "text/csv", "buffer": body}
        self.page.get_by_test_id("file").set_input_files(file)

    def report(self, name: str, body: bytes) -> dict[str, Any]:
        """Bring a log and wait for its report; the JSON that the page was given."""
        with self.page.expect_response(lambda r: "/v1/reports" in r.url, timeout=REPORT_MS) as answer:
            self.bring(name, body)
        expect(self.page.get_by_test_id("report")).to_be_visible()
        told: dict[str, Any] = answer.value.json()
        return told

    def value(self, hook: str) -> tuple[float, str]:
        """A number on screen: exactly as given to the page, and as people read it."""
        element = self.page.get_by_test_id(hook)
        return float(element.get_attribute("value") or "nan"), element.inner_text()

    def sideways(self) -> int:
        """How many pixels the page is wider than its window."""
        return int(self.page.evaluate("document.documentElement.scrollWidth - innerWidth"))

    def clean(self) -> None:
        """No complaint, no request to elsewhere, no sideways scrolling, no blot where a number should be."""
        assert self.complaints == []
        assert [url for url in self.requests if not url.startswith(self.base + "/")] == []
        assert self.sideways() <= 0
        text = self.page.locator("body").inner_text()
        for blot in ("undefined", "NaN", "null", "[object", "ident"):
            assert re.search(rf"(?<!\w){re.escape(blot)}(?!\w)", text) is None, blot


@contextmanager
def chromium() -> Iterator[Browser]:
    found = shutil.which("chromium")
    if found is None:
        if os.environ.get("CI") == "true":
            pytest.fail("CI needs the chromium command")
        pytest.skip("no chromium on this machine: the page is not tried in a browser")
    with sync_playwright() as playwright:
        # No sandbox: as root, and in most containers, Chromium will not start with one.
        browser = playwright.chromium.launch(executable_path=found, args=["--no-sandbox"])
        yield browser
        browser.close()


@contextmanager
def visitor(browser: Browser, served: Served) -> Iterator[Callable[..., Visit]]:
    """Open the page: visit(path="/", viewport=WIDE)."""
    contexts = []

    def opened(path: str = "/", viewport: Any = WIDE) -> Visit:
        context = browser.new_context(viewport=viewport)
        contexts.append(context)
        one = Visit(context.new_page(), f"http://{served.host}:{served.port}")
        one.page.on("request", lambda request: one.requests.append(request.url))
        one.page.on("pageerror", lambda error: one.complaints.append(str(error)))
        one.page.on("console", lambda m: one.complaints.append(m.text) if m.type == "error" else None)
        one.page.goto(one.base + path)
        return one

    yield opened
    for context in contexts:
        context.close()
