"""The page's list of loops, their settings, and every view in a real browser: addresses, widths, markup."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any
from urllib.parse import quote

import pytest
from browsing import NARROW, WIDE, Visit
from playwright.sync_api import expect
from watched_loop import INSTALLED, PAN, Api, here


def test_settings_are_set_and_a_refusal_stands_at_its_field(visit: Callable[..., Visit], api: Api) -> None:
    one = visit("/#/loops")
    one.page.get_by_label("A new loop").fill("new drum")
    one.page.get_by_role("button", name="Set it up").click()
    form = one.page.get_by_test_id("settings")
    form.get_by_label("Gain Kp").fill("0")
    form.get_by_label("Integral time Ti").fill("2.3")
    form.get_by_label("Time zone").fill("Europe/Vienna")
    form.get_by_label("Lowest command").fill("0")
    form.get_by_label("Highest command").fill("100")
    form.get_by_role("button").click()
    expect(one.page.get_by_test_id("settings-problem")).to_be_visible()
    gain = form.get_by_label("Gain Kp")
    expect(gain).to_have_attribute("aria-invalid", "true")
    expect(gain).to_be_focused()
    gain.fill("0.075")
    form.get_by_role("button").click()
    expect(one.page.get_by_test_id("no-nights")).to_be_visible()
    told = api("GET", "/loops/new%20drum")
    assert told["installed"] == {**INSTALLED, "Td": 0.0, "Tf": 0.0, "b": 1.0}
    assert told["zone"] == "Europe/Vienna"
    assert told["command_limits"] == {"low": 0.0, "high": 100.0}
    assert told["period"] is None
    # Shown again as they are, and sent back unchanged.
    one.page.get_by_test_id("to-settings").click()
    expect(form.get_by_label("Gain Kp")).to_have_value("0.075")
    form.get_by_role("button", name="Save the settings").click()
    expect(one.page.get_by_test_id("no-nights")).to_be_visible()
    assert api("GET", "/loops/new%20drum") == told


def test_loops_are_listed_page_by_page(visit: Callable[..., Visit], api: Api, pan: list[dict[str, Any]]) -> None:
    for i in range(21):
        api("PUT", f"/loops/aisle%20{i:02}", {})
    one = visit("/#/loops")
    rows = one.page.get_by_test_id("loops").locator("tbody tr")
    expect(rows).to_have_count(20)
    expect(rows.first).to_contain_text("no logs yet")
    one.page.get_by_role("link", name="Next page").click()
    expect(rows.first).to_contain_text("aisle 20")
    assert "after=" in one.page.url
    watched = rows.filter(has_text=PAN)
    expect(watched.get_by_test_id("loop-verdict")).to_contain_text(f"moved {pan[-1]['at'][:10]}")
    one.page.reload()
    expect(rows.first).to_contain_text("aisle 20")
    one.page.go_back()
    expect(rows.first).to_contain_text("aisle 00")
    watched_page = visit("/#/loops?after=aisle+20")
    watched_page.page.get_by_role("link", name=PAN).click()
    expect(watched_page.page.get_by_test_id("verdict")).to_be_visible()


def test_without_loops_the_list_says_how_they_begin(visit: Callable[..., Visit]) -> None:
    one = visit()
    one.page.route("**/v1/loops?*", lambda route: route.fulfill(json=[]))
    one.page.goto(one.base + "/#/loops")
    expect(one.page.get_by_test_id("no-loops")).to_contain_text("There are no loops yet")


@pytest.mark.parametrize("viewport", [WIDE, NARROW], ids=["1440", "390"])
def test_every_view_is_clean(visit: Callable[..., Visit], pan: list[dict[str, Any]], viewport: dict[str, int]) -> None:
    one = visit(viewport=viewport)
    views = {
        "/#/loops": "loops",
        here(PAN): "verdict",
        f"{here(PAN)}/settings": "settings",
        f"/#/reports/{pan[-1]['report_id']}": "report",
    }
    for address, landmark in views.items():
        one.page.goto(one.base + address)
        expect(one.page.get_by_test_id(landmark)).to_be_visible()
        expect(one.page.get_by_text("looking …")).to_have_count(0)
        one.clean()


def test_markup_in_a_loop_s_name_stays_text(visit: Callable[..., Visit], api: Api) -> None:
    trap = "<img src=x onerror=window.caught=1>"
    api("PUT", api.loop(trap), {"units": {"speed": "<b>rpm"}})
    one = visit(here(trap))
    expect(one.page.get_by_role("heading", name=trap)).to_be_visible()
    one.page.get_by_test_id("to-settings").click()
    expect(one.page.get_by_label("Unit of speed")).to_have_value("<b>rpm")
    one.page.goto(one.base + "/#/loops?after=" + quote(trap[:-1]))
    expect(one.page.get_by_role("link", name=trap)).to_be_visible()
    assert one.page.locator("main img").count() == 0
    assert one.page.evaluate("window.caught") is None


@pytest.mark.parametrize(
    "address", ["/#/reports/rep_none", "/#/analyses/ana_none", "/#/loops/none", "/#/loops/%E0%A4%A", "/#/nowhere"]
)
def test_an_address_of_nothing_says_so(visit: Callable[..., Visit], address: str) -> None:
    one = visit(address)
    expect(one.page.get_by_role("heading", level=1)).to_be_visible()
    expect(one.page.get_by_role("link", name="Bring a")).not_to_have_count(0)
    assert not [text for text in one.complaints if "status of 4" not in text]
