"""One loop on the page in a real browser: its verdict, its nights over time, the choice of a baseline."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import pytest
from browsing import REPORT_MS, Visit
from nights import still
from playwright.sync_api import FilePayload, expect
from watched_loop import BASELINE, NIGHTS, PAN, Api, here


def csv(name: str, body: bytes) -> FilePayload:
    return {"name": name, "mimeType": "text/csv", "buffer": body}


def test_the_verdict_is_the_service_s_own(visit: Callable[..., Visit], api: Api, pan: list[dict[str, Any]]) -> None:
    one = visit(here(PAN))
    drift = api("GET", f"{api.loop(PAN)}/drift")
    assert drift["verdict"] == "moved"
    verdict = one.page.get_by_test_id("verdict")
    expect(verdict).to_have_attribute("data-verdict", "moved")
    expect(verdict.get_by_role("heading", level=2)).to_have_text("The loop has moved")
    expect(verdict).to_contain_text(f"Since {pan[-1]['at'][:10]}")
    for name, parameter in drift["parameters"].items():
        row = one.page.get_by_test_id(f"drift-{name}")
        expect(row.locator("td").first).to_contain_text(parameter["verdict"].replace("-", " "))
        for key, place in (("baseline", 2), ("now", 3)):
            assert float(row.locator("td").nth(place).inner_text()) == pytest.approx(parameter[key], rel=5e-4)
        statistic, threshold = row.locator("td").nth(7).inner_text().split(", ")
        assert float(statistic) == pytest.approx(parameter["statistic"], rel=5e-3)
        assert float(threshold) == pytest.approx(parameter["threshold"], rel=5e-3)
    low, high = drift["margin"]["ci95"]
    margin = one.page.get_by_test_id("margin-now")
    expect(margin).to_contain_text(f"{drift['margin']['Ms_now']:.3f}")
    expect(margin).to_contain_text(f"{low:.2f} to {high:.2f}")
    expect(margin).to_contain_text("The installed settings, Kp 0.075, Ti 2.3 s: within the target")
    # The interval of every night, that of the last as the verdict has it.
    expect(one.page.get_by_test_id("panel-Ms").locator("svg .whisker")).to_have_count(len(pan))
    one.page.get_by_role("button", name="Later night").click()
    expect(one.page.get_by_test_id("panel-Ms").locator("output")).to_contain_text(f"({low:.3f} to {high:.3f})")


def test_charts_can_be_read_by_pointer_keyboard_and_table(
    visit: Callable[..., Visit], pan: list[dict[str, Any]]
) -> None:
    one = visit(here(PAN))
    gain = one.page.get_by_test_id("panel-K")
    expect(gain.locator("svg .night")).to_have_count(len(pan))
    expect(gain.locator("svg .night.baseline")).to_have_count(BASELINE)
    expect(gain.locator("svg .night.moved")).to_have_count(1)
    expect(gain.locator("svg .whisker")).to_have_count(len(pan))
    for panel in ("K", "T", "L", "Ms", "fit", "rms"):
        plot = one.page.get_by_test_id(f"panel-{panel}").locator("svg.plot")
        assert plot.locator("title").text_content()
        assert f"{len(pan)} of {len(pan)} nights" in (plot.locator("desc").text_content() or "")
    group = one.page.get_by_role("group", name="Charts of the nights")
    group.focus()
    one.page.keyboard.press("End")
    last = pan[-1]["parameters"]["K"]
    shown = [float(text) for text in re.findall(r"[\d.]+", gain.locator("output").inner_text().replace("rpm/%", ""))]
    assert shown == pytest.approx([last["value"], *last["ci95"]], abs=6e-4)
    one.page.keyboard.press("Home")
    expect(one.page.get_by_test_id("night-name")).to_contain_text(pan[0]["at"][:10])
    box = gain.locator("svg.plot").bounding_box()
    assert box is not None
    one.page.mouse.move(box["x"] + box["width"] - 20, box["y"] + 60)
    expect(one.page.get_by_test_id("night-name")).to_contain_text(pan[-1]["at"][:10])
    one.page.get_by_test_id("history-table").locator("summary").click()
    expect(one.page.get_by_test_id("history-table").locator("tbody tr")).to_have_count(len(pan))
    one.page.get_by_role("button", name="Open its report").click()
    expect(one.page.get_by_test_id("report-loop")).to_have_text(PAN)
    assert one.page.url.endswith(pan[-1]["report_id"])


def test_a_baseline_is_chosen_on_the_page_and_an_empty_night_is_no_news(visit: Callable[..., Visit], api: Api) -> None:
    name = "drum 8"
    one = visit(here(name))
    expect(one.page.get_by_test_id("problem-code")).to_have_text("no-such-loop")
    one.complaints.clear()  # the browser's own word on that answer
    for log in NIGHTS[:BASELINE]:
        api("POST", f"{api.loop(name)}/logs", log)
    one.page.reload()
    expect(one.page.get_by_test_id("no-baseline")).to_be_visible()
    boxes = one.page.get_by_test_id("baseline").get_by_role("checkbox")
    for i in range(BASELINE):
        boxes.nth(i).check()
    one.page.get_by_test_id("save-baseline").click()
    expect(one.page.get_by_test_id("verdict")).to_contain_text("Nothing to compare yet")
    assert len(api("GET", api.loop(name))["baseline"]) == BASELINE
    # Two more, from the loop's own page: an ordinary one and one in which nothing happens.
    files = [csv("same.csv", NIGHTS[BASELINE]), csv("still.csv", still(40))]
    one.page.get_by_test_id("night-file").set_input_files(files)
    one.page.get_by_test_id("sent").click(timeout=REPORT_MS)
    verdict = one.page.get_by_test_id("verdict")
    expect(verdict).to_have_attribute("data-verdict", "no-news")
    expect(verdict).to_contain_text("not the same as “not moved”")
    expect(verdict).to_contain_text("What stands is the log of 2026-11-22: the loop had not moved.")
    expect(one.page.get_by_test_id("night").last).to_contain_text("no news")
    one.clean()


def test_a_night_without_a_model_leaves_its_place_empty(visit: Callable[..., Visit], api: Api) -> None:
    name = "drum 9"
    for log in (NIGHTS[0], still(40)):
        api("POST", f"{api.loop(name)}/logs", log)
    one = visit(here(name))
    expect(one.page.get_by_test_id("night")).to_have_count(2)
    expect(one.page.get_by_test_id("panel-K").locator("svg .night")).to_have_count(1)
    # Nobody told the installed settings, but the first night shows them.
    expect(one.page.get_by_test_id("panel-Ms").locator("svg .night")).to_have_count(1)
    expect(one.page.get_by_test_id("panel-Ms")).to_contain_text("of the controller that the logs show")
    expect(one.page.get_by_test_id("baseline").get_by_role("checkbox").nth(1)).to_be_disabled()
    one.clean()
