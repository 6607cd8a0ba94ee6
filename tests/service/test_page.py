"""The page in a real browser: a log goes in, the numbers on screen are those of the API."""

from __future__ import annotations

import hashlib
import json
import re
import urllib.request
from collections.abc import Callable
from pathlib import Path

import pytest
from browsing import NARROW, REPORT_MS, WIDE, Visit
from conftest import ROOT
from playwright.sync_api import expect

SAMPLES = ROOT / "sample_logs"


def shown_as(value: float, text: str) -> None:
    """The text is the value rounded to the text's own decimals (a true minus sign is read as one)."""
    plain = text.replace("\u2212", "-")
    decimals = len(plain.partition(".")[2])
    assert float(plain) == pytest.approx(value, abs=0.5000001 * 10**-decimals)
    # Rounded, but to something worth reading: three digits at least.
    assert len(re.sub(r"^0+", "", re.sub(r"\D", "", plain))) >= 3


def test_the_numbers_on_the_page_are_those_of_the_api(visit: Callable[..., Visit], step_test: bytes) -> None:
    one = visit()
    told = one.report("step_test.csv", step_test)
    request = urllib.request.Request(f"{one.base}/v1/reports", step_test, {"Content-Type": "text/csv"}, method="POST")
    with urllib.request.urlopen(request) as answer:
        assert json.load(answer) == told
    parameters = told["fits"][told["selected"]]["parameters"]
    settings = told["tunings"][told["recommended"]]["settings"]
    hooks = {f"{place}-{name}": parameters[name]["value"] for name in "KTL" for place in ("headline", "parameter")}
    hooks |= {f"setting-{name}": settings[name] for name in ("Kp", "Ti")}
    for hook, expected in hooks.items():
        value, text = one.value(hook)
        assert value == expected, hook
        shown_as(expected, text)
    assert one.complaints == []


def test_value_and_standard_deviation_agree_in_their_decimals(visit: Callable[..., Visit], step_test: bytes) -> None:
    one = visit()
    one.report("step_test.csv", step_test)
    for name in "KTL":
        cells = (
            one.page.get_by_test_id("parameters").locator("tr").filter(has=one.page.get_by_test_id(f"parameter-{name}"))
        )
        value, std = cells.locator("td").nth(0).inner_text(), cells.locator("td").nth(1).inner_text()
        assert len(value.partition(".")[2]) == len(std.partition(".")[2]), (value, std)


def test_a_file_dropped_on_the_page_is_analysed(visit: Callable[..., Visit], step_test: bytes) -> None:
    one = visit()
    transfer = one.page.evaluate_handle(
        """(text) => {
            const transfer = new DataTransfer();
            transfer.items.add(new File([text], "dropped.csv", { type: "text/csv" }));
            return transfer;
        }""",
        step_test.decode(),
    )
    one.page.dispatch_event("[data-testid=drop]", "drop", {"dataTransfer": transfer})
    expect(one.page.get_by_role("heading", name="dropped.csv")).to_be_visible(timeout=REPORT_MS)
    expect(one.page.get_by_test_id("model")).to_contain_text("First-order")


@pytest.mark.parametrize("viewport", [WIDE, NARROW], ids=["1440", "390"])
@pytest.mark.parametrize("name", ["step_test", "setpoint_change", "oscillating", "nothing_to_learn"])
def test_every_sample_draws_without_complaint_or_sideways_scrolling(
    visit: Callable[..., Visit], name: str, viewport: dict[str, int]
) -> None:
    one = visit(viewport=viewport)
    expect(one.page.get_by_test_id("drop")).to_be_visible()
    assert one.sideways() <= 0
    told = one.report(f"{name}.csv", (SAMPLES / f"{name}.csv").read_bytes())
    expect(one.page.locator("[data-testid=part-trend] canvas").first).to_be_visible()
    one.clean()
    charts = one.page.locator("svg.plot")
    assert (charts.count() > 0) is (told["selected"] is not None)


def test_a_log_without_information_says_why_and_what_to_do(visit: Callable[..., Visit]) -> None:
    one = visit()
    told = one.report("quiet.csv", (SAMPLES / "nothing_to_learn.csv").read_bytes())
    assert told["selected"] is None
    expect(one.page.get_by_test_id("reason")).to_have_text(told["record"]["excitation"]["reason"])
    expect(one.page.get_by_test_id("advice")).to_have_text(told["record"]["advice"]["message"])
    for part in ("predicted", "robustness", "tunings", "parameters", "statistics", "residuals"):
        expect(one.page.get_by_test_id(f"part-{part}")).to_have_count(0)


def test_a_refusal_shows_its_sentence_and_its_code(visit: Callable[..., Visit]) -> None:
    one = visit()
    with one.page.expect_response(lambda r: "/v1/reports" in r.url, timeout=REPORT_MS) as answer:
        one.bring("picture.csv", b"\x89PNG\r\n\x1a\n" + bytes(range(256)) * 8)
    told = answer.value.json()
    assert answer.value.status >= 400
    expect(one.page.get_by_test_id("problem-message")).to_have_text(told["detail"])
    expect(one.page.get_by_test_id("problem-code")).to_have_text(told["code"])
    # And the page goes on.
    one.page.get_by_role("link", name="Bring another log").click()
    expect(one.page.get_by_test_id("drop")).to_be_visible()


def test_the_sample_opens_by_keyboard_and_has_an_address(visit: Callable[..., Visit]) -> None:
    one = visit()
    button = one.page.get_by_test_id("sample").first
    expect(button).to_be_visible()
    for _ in range(12):
        one.page.keyboard.press("Tab")
        if button.evaluate("node => node === document.activeElement"):
            break
    expect(button).to_be_focused()
    assert button.evaluate("node => getComputedStyle(node).outlineStyle") == "solid"
    one.page.keyboard.press("Enter")
    expect(one.page.get_by_test_id("report")).to_be_visible(timeout=REPORT_MS)
    assert one.page.url.endswith("/#/sample/step_test.csv")
    one.page.reload()
    expect(one.page.get_by_test_id("report")).to_be_visible(timeout=REPORT_MS)


def test_a_one_off_report_is_gone_after_a_reload_and_says_so(visit: Callable[..., Visit], step_test: bytes) -> None:
    one = visit()
    one.report("step_test.csv", step_test)
    one.page.reload()
    expect(one.page.get_by_test_id("notice")).to_contain_text("Drop the log again")


def test_the_options_reach_the_service(visit: Callable[..., Visit], step_test: bytes) -> None:
    one = visit()
    one.page.get_by_test_id("options").locator("summary").click()
    one.page.get_by_label("Target Ms").fill("1.4")
    one.page.get_by_label("Controller", exact=True).select_option("pid")
    told = one.report("step_test.csv", step_test)
    assert (told["options"]["Ms"], told["options"]["form"], told["options"]["goal"]) == (1.4, "pid", "integral")
    assert told["tunings"][told["recommended"]]["settings"]["Td"] > 0.0
    expect(one.page.get_by_test_id("margin-target")).to_have_text("1.4")
    one.page.get_by_test_id("again-fold").locator("summary").click()
    again = one.page.get_by_test_id("again")
    expect(again.get_by_label("Target Ms")).to_have_value("1.4")
    expect(again.get_by_label("Controller", exact=True)).to_have_value("pid")
    again.get_by_label("Target Ms").fill("2")
    with one.page.expect_response(lambda r: "/v1/reports" in r.url, timeout=REPORT_MS) as answer:
        again.get_by_role("button", name="Analyse again").click()
    assert answer.value.json()["options"]["Ms"] == 2
    expect(one.page.get_by_test_id("margin-target")).to_have_text("2")


def test_markup_in_a_log_stays_text(visit: Callable[..., Visit], step_test: bytes) -> None:
    trap = "<img src=x onerror=window.caught=1>"
    one = visit()
    head, _, rows = step_test.partition(b"\n")
    renamed = head.replace(b"speed", b"speed " + trap.encode())
    one.page.get_by_test_id("options").locator("summary").click()
    one.page.get_by_label("Measured speed").fill(renamed.decode().split(",")[-1])
    one.report(f"{trap}.csv", renamed + b"\n" + rows)
    expect(one.page.get_by_role("heading", name=f"{trap}.csv")).to_be_visible()
    expect(one.page.get_by_test_id("part-log")).to_contain_text(trap)
    assert one.page.locator("main img").count() == 0
    assert one.page.evaluate("window.caught") is None


def test_zooming_moves_both_strips(visit: Callable[..., Visit], step_test: bytes) -> None:
    one = visit()
    one.report("step_test.csv", step_test)
    trend = one.page.get_by_test_id("part-trend")
    canvases = trend.locator("canvas")
    expect(canvases).to_have_count(2)
    before = [canvases.nth(i).evaluate("node => node.toDataURL()") for i in range(2)]
    trend.get_by_role("button", name="Zoom in").click()
    one.page.wait_for_timeout(200)
    after = [canvases.nth(i).evaluate("node => node.toDataURL()") for i in range(2)]
    assert before[0] != after[0]
    assert before[1] != after[1]
    trend.get_by_role("button", name="Show the whole log").click()
    one.page.wait_for_timeout(200)
    assert [canvases.nth(i).evaluate("node => node.toDataURL()") for i in range(2)] == before


def test_charts_have_words_and_tables(visit: Callable[..., Visit], step_test: bytes) -> None:
    one = visit()
    one.report("step_test.csv", step_test)
    plots = one.page.locator("svg.plot")
    for i in range(plots.count()):
        assert plots.nth(i).locator("title").text_content()
        assert plots.nth(i).locator("desc").text_content()
    table = one.page.get_by_test_id("part-trend").locator("details")
    table.locator("summary").click()
    assert table.locator("tbody tr").count() == 60


def test_the_report_can_be_taken_home(visit: Callable[..., Visit], step_test: bytes) -> None:
    one = visit()
    told = one.report("step_test.csv", step_test)
    with one.page.expect_download() as download:
        one.page.get_by_test_id("download").click()
    assert download.value.suggested_filename == "step_test-report.json"
    assert json.loads(Path(download.value.path()).read_text()) == told


def test_the_vendored_library_is_the_one_its_readme_names() -> None:
    # Source: the sums taken from the npm package uplot 1.6.32 when it was copied.
    folder = ROOT / "service" / "page" / "vendor" / "uplot"
    sums = dict(re.findall(r"\| `([^`]+)` \| `([0-9a-f]{64})` \|", (folder / "README.md").read_text()))
    assert set(sums) == {path.name for path in folder.iterdir()} - {"README.md"}
    for name, expected in sums.items():
        assert hashlib.sha256((folder / name).read_bytes()).hexdigest() == expected, name


# Sources: JCGM 100:2008 (GUM) 7.2.6, two digits of the standard uncertainty and the value to the same decimal
# place; its example 100.021 47 g with 0.35 mg. The others by hand from that rule.
ESTIMATES = [
    ((100.02147, 0.00035), ("100.02147", "0.00035")),
    ((14.58734, 0.02131), ("14.587", "0.021")),
    ((-0.51249, 0.0996), ("\u22120.51", "0.10")),  # 0.0996 is 0.10 with two digits
    ((2461.7, 137.0), ("2462", "137")),
    ((3.0, None), ("3.000", "–")),
    ((4.2e-9, 3.1e-10), ("4.200 × 10⁻⁹", "3.100 × 10⁻¹⁰")),
]


def test_estimates_are_rounded_by_their_uncertainty(visit: Callable[..., Visit]) -> None:
    shown = visit().page.evaluate(
        """async (estimates) => {
            const { estimate } = await import("/page/format.js");
            return estimates.map(([value, std]) => {
              const one = estimate({ value, std, ci95: [null, null] });
              return [one.value, one.std];
            });
        }""",
        [list(given) for given, _ in ESTIMATES],
    )
    assert shown == [list(expected) for _, expected in ESTIMATES]


# By hand; the third is a number that rounds up into another decade.
SIGNIFICANT = [
    (0.157312, "0.1573"),
    (1.62, "1.620"),
    (0.99999, "1.000"),
    (-12345.6, "\u221212346"),
    (0, "0"),
    (2e-6, "2.000 × 10⁻⁶"),
]


def test_four_significant_digits(visit: Callable[..., Visit]) -> None:
    shown = visit().page.evaluate(
        """async (values) => {
            const { significant } = await import("/page/format.js");
            return values.map((value) => significant(value, 4));
        }""",
        [value for value, _ in SIGNIFICANT],
    )
    assert shown == [expected for _, expected in SIGNIFICANT]


def test_a_question_the_log_leaves_open_can_be_answered_on_the_page(visit: Callable[..., Visit]) -> None:
    lines = (SAMPLES / "step_test.csv").read_text().splitlines()
    stamped = [re.sub(r"^2026-11-17T(.{12})\+01:00", r"03/02/2026 \1", line) for line in lines]
    one = visit()
    with one.page.expect_response(lambda r: "/v1/reports" in r.url, timeout=REPORT_MS) as answer:
        one.bring("open.csv", "\n".join(stamped).encode())
    assert answer.value.json()["code"] == "ambiguous-dates"
    one.page.get_by_text("Change the options").click()
    again = one.page.get_by_test_id("again")
    again.get_by_label("Order of the dates").select_option("dmy")
    again.get_by_label("Time zone").fill("Europe/Vienna")
    again.get_by_role("button", name="Analyse again").click()
    expect(one.page.get_by_test_id("part-log")).to_contain_text("2026-02-03 05:40:00 UTC", timeout=REPORT_MS)
