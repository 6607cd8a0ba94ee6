"""On the page: how a log is read, asked before it is used; what is confirmed is kept with the loop."""

from __future__ import annotations

import json
import urllib.request
from collections.abc import Callable

import pytest
from browsing import NARROW, REPORT_MS, WIDE, Visit
from playwright.sync_api import expect

# A German export: semicolons, decimal commas, local times without a zone; a step up and down.
ODD = (
    "Zeit;Stellgröße [%];Drehzahl [U/min]\r\n"
    + "".join(
        f"17.11.2026 06:{k // 60:02d}:{k % 60:02d};"
        f"{40 + 2 * (k % 120 > 60)},5;{600 + 30 * (k % 120 > 66)},{k * 7 % 10}\r\n"
        for k in range(480)
    )
).encode("cp1252")


@pytest.mark.parametrize("size", [WIDE, NARROW], ids=["wide", "narrow"])
def test_a_log_is_shown_as_read_and_then_goes_on(visit: Callable[..., Visit], size: dict[str, int]) -> None:
    one = visit(viewport=size)
    one.page.get_by_test_id("look").check()
    one.bring("export.csv", ODD)
    seen = one.page.get_by_test_id("understood")
    expect(seen).to_be_visible(timeout=REPORT_MS)
    expect(seen).to_contain_text("Drehzahl [U/min]")
    expect(seen).to_contain_text("decimal comma")
    expect(seen).to_contain_text("no absolute time")
    one.clean()
    otherwise = one.page.get_by_test_id("otherwise")
    otherwise.get_by_label("Time zone of the stamps").fill("Europe/Berlin")
    otherwise.get_by_role("button", name="Read it again").click()
    expect(seen).not_to_contain_text("no absolute time", timeout=REPORT_MS)
    one.page.get_by_test_id("right").click()
    expect(one.page.get_by_test_id("report")).to_be_visible(timeout=REPORT_MS)


def test_what_is_confirmed_is_kept_with_the_loop(visit: Callable[..., Visit]) -> None:
    one = visit()
    one.page.get_by_test_id("loop-name").fill("looked at")
    one.page.get_by_test_id("look").check()
    one.page.get_by_test_id("options").locator("summary").click()
    one.page.get_by_label("Time zone of the stamps").fill("Europe/Berlin")
    one.bring("export.csv", ODD)
    one.page.get_by_test_id("right").click(timeout=REPORT_MS)
    expect(one.page.get_by_test_id("report")).to_be_visible(timeout=REPORT_MS)
    with urllib.request.urlopen(f"{one.base}/v1/loops/looked%20at") as answer:
        assert json.load(answer)["zone"] == "Europe/Berlin"
