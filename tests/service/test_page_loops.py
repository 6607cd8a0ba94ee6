"""The page's kept path in a real browser: loops, their nights, verdicts, settings, reports that stay."""

from __future__ import annotations

import json
import re
import urllib.request
from collections.abc import Callable, Iterator
from typing import Any
from urllib.parse import quote

import numpy as np
import pytest
from browsing import NARROW, REPORT_MS, WIDE, Visit, chromium, visitor
from conftest import ROOT, Served
from nights import still
from playwright.sync_api import Browser, FilePayload, Route, expect

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


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with chromium() as browser:
        yield browser


@pytest.fixture
def visit(browser: Browser, served: Served) -> Iterator[Callable[..., Visit]]:
    with visitor(browser, served) as visit:
        yield visit


@pytest.fixture(scope="module")
def api(served: Served) -> Api:
    return Api(served)


@pytest.fixture(scope="module")
def pan(api: Api) -> list[dict[str, Any]]:
    """A loop whose gain has fallen on its last night, watched; its history."""
    loop = api.loop(PAN)
    api("PUT", loop, {"installed": INSTALLED, "period": 0.1})
    for log in (*NIGHTS[: BASELINE + 1], NIGHTS[FALLEN]):
        assert api("POST", f"{loop}/logs", log)["status"] == "done"
    rows: list[dict[str, Any]] = api("GET", f"{loop}/history")
    api("PUT", f"{loop}/baseline", {"report_ids": [row["report_id"] for row in rows[:BASELINE]]})
    history: list[dict[str, Any]] = api("GET", f"{loop}/history")
    return history


def csv(name: str, body: bytes) -> FilePayload:
    return {"name": name, "mimeType": "text/csv", "buffer": body}


def here(name: str) -> str:
    return f"/#/loops/{quote(name, safe='')}"


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


def second_order(poles: tuple[complex, complex]) -> bytes:
    """A step test of K = 12, L = 0.3 s with these poles (1/s), sampled exactly every 0.1 s; noise of 1 rpm."""
    h, n, delay = 0.1, 900, 3
    a, b = poles
    # Residues of 1/s times the unit-gain plant: its step response, by hand.
    t = h * np.arange(n)
    step = (1 + (b * np.exp(a * t) - a * np.exp(b * t)) / (a - b)).real
    u = np.repeat([40.0, 50.0, 42.0, 55.0, 45.0, 50.0, 40.0, 52.0, 47.0], n // 9)
    y = np.full(n, 600.0)
    for k in np.flatnonzero(np.diff(u)) + 1:
        y[k + delay :] += 12.0 * (u[k] - u[k - 1]) * step[: n - k - delay]
    y += np.random.default_rng(3).standard_normal(n)
    rows = [f"{t[k]:.1f},{u[k]:.2f},{y[k]:.3f}" for k in range(n)]
    return "\n".join(["time [s],command [%],speed [rpm]", *rows, ""]).encode()


# Time constants 1.5 s and 0.8 s; w0 = 2 rad/s with zeta = 0.4.
LAGS, RINGING = (-1 / 1.5, -1 / 0.8), (complex(-0.8, 1.8330303), complex(-0.8, -1.8330303))


@pytest.mark.parametrize(
    ("poles", "truth", "formula"),
    [
        (LAGS, {"K": 12.0, "T1": 1.5, "T2": 0.8, "L": 0.3}, "K exp(−L s)/((T1 s + 1)(T2 s + 1))"),
        (RINGING, {"K": 12.0, "w0": 2.0, "zeta": 0.4, "L": 0.3}, "K ω0² exp(−L s)/(s² + 2 ζ ω0 s + ω0²)"),
    ],
    ids=["two lags", "ringing"],
)
def test_a_second_order_fit_is_shown_as_what_it_is(
    visit: Callable[..., Visit], poles: tuple[complex, complex], truth: dict[str, float], formula: str
) -> None:
    one = visit()
    told = one.report("second.csv", second_order(poles))
    chosen = told["fits"][told["selected"]]
    assert chosen["model"] == "sopdt"
    for name, value in truth.items():
        shown, _ = one.value(f"headline-{name}")
        assert shown == chosen["parameters"][name]["value"]
        assert shown == pytest.approx(value, rel=0.15)
    assert one.page.get_by_test_id("formula").inner_text().split() == formula.split()
    expect(one.page.get_by_test_id("selected-because")).to_have_text(told["selected_because"])
    (other,) = (fit for fit in told["fits"] if fit is not chosen)
    expect(one.page.get_by_test_id("fit-fopdt")).to_contain_text(f"{other['statistics']['fit_percent']:.2f}")
    expect(one.page.get_by_test_id("fit-sopdt")).to_contain_text("chosen")
    # What was noticed about the first-order fit alone is not said of the chosen one.
    alone = {f["code"] for f in other["findings"]} - {f["code"] for f in chosen["findings"]}
    assert alone
    for code in alone:
        expect(one.page.get_by_test_id("part-findings").get_by_test_id(f"finding-{code}")).to_have_count(0)
        expect(one.page.get_by_test_id("other-fopdt").get_by_test_id(f"finding-{code}")).to_have_count(1)
    one.clean()


def test_a_second_order_night_stands_in_the_history_with_the_sum_of_its_time_constants(
    visit: Callable[..., Visit], api: Api
) -> None:
    name = "drum 11"
    told = api("POST", f"{api.loop(name)}/logs", second_order(LAGS))
    report = api("GET", f"/reports/{told['report_id']}")
    sum_of_lags = report["fits"][report["selected"]]["derived"]["T1 + T2"]
    (first,) = (fit["parameters"] for fit in report["fits"] if fit["model"] == "fopdt")
    one = visit(here(name))
    one.page.get_by_role("button", name="Later night").click()
    shown = one.page.get_by_test_id("panel-T").locator("output").inner_text()
    numbers = [float(text) for text in re.findall(r"\d+\.\d+", shown)]
    both = [one for each in (sum_of_lags, first["T"]) for one in (each["value"], *each["ci95"])]
    assert numbers == pytest.approx(both, abs=6e-3)
    for name in "KTL":
        expect(one.page.get_by_test_id(f"panel-{name}").locator("svg .ring")).to_have_count(1)
    expect(one.page.get_by_test_id("night")).to_contain_text("first order")
    expect(one.page.get_by_test_id("part-history")).to_contain_text("the verdict compares first-order fits")
    one.clean()
