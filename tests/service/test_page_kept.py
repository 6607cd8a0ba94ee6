"""The page's kept path in a real browser: a log on its way, its report at an address that stays, another target."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import pytest
from browsing import REPORT_MS, Visit
from playwright.sync_api import Route, expect
from watched_loop import NIGHTS, Api


def test_a_log_kept_with_a_loop_has_a_report_at_an_address_that_stays(visit: Callable[..., Visit], api: Api) -> None:
    one = visit()
    one.page.get_by_test_id("loop-name").fill("drum 7")
    one.bring("night.csv", NIGHTS[0])
    expect(one.page.get_by_test_id("report")).to_be_visible(timeout=REPORT_MS)
    address = one.page.url
    report_id = address.rpartition("/")[2]
    assert re.search(r"#/reports/rep_\w+$", address)
    told = api("GET", f"/reports/{report_id}")
    assert one.value("headline-K")[0] == told["fits"][told["selected"]]["parameters"]["K"]["value"]
    expect(one.page.get_by_test_id("report-loop")).to_have_text("drum 7")
    one.page.reload()
    expect(one.page.get_by_test_id("report-loop")).to_have_text("drum 7")
    # "Back" leads to where the log was brought, past the analysis; "forward" to the report again.
    one.page.go_back()
    expect(one.page.get_by_test_id("drop")).to_be_visible()
    one.page.go_forward()
    one.page.get_by_test_id("report-loop").click()
    expect(one.page.get_by_test_id("no-baseline")).to_be_visible()
    expect(one.page.get_by_test_id("night")).to_have_count(1)
    # Known from now on, so the start suggests it.
    one.page.goto(one.base + "/#/")
    expect(one.page.locator('#loop-names option[value="drum 7"]')).to_have_count(1)
    one.clean()


def test_progress_shows_the_stage_that_the_service_is_in(visit: Callable[..., Visit]) -> None:
    told = {"id": "ana_1", "loop": "drum", "log_id": "log_1", "report_id": None, "problem": None}
    answers = [
        {**told, "status": "queued", "stage": "queued", "progress": 0.0},
        *[{**told, "status": "running", "stage": "judging", "progress": 0.4}] * 3,
        {**told, "status": "failed", "stage": "failed", "progress": 1.0,
         "problem": {"code": "no-speed", "detail": "Say which column is the speed.", "evidence": {}}},
    ]  # fmt: skip

    def answer(route: Route) -> None:
        route.fulfill(json=answers.pop(0))

    one = visit()
    one.page.route("**/v1/analyses/ana_1", answer)
    one.page.goto(one.base + "/#/analyses/ana_1")
    step = one.page.get_by_test_id("stages").locator("[aria-current=step]")
    expect(step).to_have_attribute("data-stage", "queued")
    expect(step).to_have_attribute("data-stage", "judging")
    assert one.page.get_by_role("progressbar").evaluate("bar => bar.value") == 0.4
    expect(one.page.get_by_test_id("problem-message")).to_have_text("Say which column is the speed.")
    expect(one.page.get_by_test_id("problem-code")).to_have_text("no-speed")
    expect(one.page.get_by_role("link", name="To drum")).to_have_attribute("href", "#/loops/drum")


def test_another_target_stands_beside_the_report_s_own(
    visit: Callable[..., Visit], api: Api, pan: list[dict[str, Any]]
) -> None:
    report_id = pan[0]["report_id"]
    one = visit(f"/#/reports/{report_id}")
    form = one.page.get_by_test_id("another")
    expect(form.get_by_label("Target Ms")).to_have_value("1.6")
    form.get_by_label("Target Ms").fill("1.3")
    form.get_by_role("button", name="Propose").click()
    told = api("POST", f"/reports/{report_id}/tunings", {"Ms": 1.3})
    best = told["tunings"][told["recommended"]]
    cells = one.page.get_by_test_id("retuned-best").locator("td")
    expect(cells.first).to_be_visible(timeout=REPORT_MS)
    assert float(cells.nth(0).inner_text()) == pytest.approx(best["settings"]["Kp"], rel=5e-4)
    assert float(cells.nth(1).inner_text()) == pytest.approx(best["settings"]["Ti"], rel=5e-4)
    assert float(cells.nth(3).inner_text()) == pytest.approx(1.3, abs=2e-3)
    before = float(one.page.get_by_test_id("retuned-before").locator("td").first.inner_text())
    assert before == pytest.approx(one.value("setting-Kp")[0], rel=5e-4)
    assert "Ms=1.3" in one.page.url
    one.page.reload()
    expect(one.page.get_by_test_id("retuned-best")).to_contain_text("Ms 1.3", timeout=REPORT_MS)
    one.clean()


def test_a_log_that_gives_no_report_says_why_at_its_loop(visit: Callable[..., Visit]) -> None:
    name = "drum 10"
    one = visit()
    one.page.get_by_test_id("loop-name").fill(name)
    one.bring("words.csv", b"time,command,speed\nnever,was,here\n" * 40)
    expect(one.page.get_by_test_id("problem")).to_be_visible(timeout=REPORT_MS)
    assert "#/analyses/ana_" in one.page.url
    said = one.page.get_by_test_id("problem-message").inner_text()
    one.page.get_by_role("link", name=f"To {name}").click()
    expect(one.page.get_by_test_id("part-failed")).to_contain_text(said)
    expect(one.page.get_by_test_id("no-nights")).to_be_visible()
    one.clean()
