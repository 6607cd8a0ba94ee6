"""What is known of a loop: kept once, used for its later logs, refused where it makes no sense."""

from __future__ import annotations

from typing import Any

import expect
import pytest
from conftest import ROOT
from keeping import keep, variant
from starlette.testclient import TestClient

NAMELESS = b"0;590;42\n1;591;42\n" + b"".join(
    b"%d;%d;%d\n" % (i, 590 + 3 * (i > 40), 42 + (i > 40)) for i in range(2, 90)
)


def test_later_logs_use_what_is_known_of_the_loop(service: TestClient) -> None:
    known = {
        "units": {"speed": "rpm", "command": "%"},
        "columns": {"time": "0", "speed": "1", "command": "2"},
        "period": 0.5,
        "defaults": {"Ms": 1.8},
    }
    assert service.put("/v1/loops/pan", json=known).status_code == 201
    told = keep(service, NAMELESS)
    assert told["options"] == {
        "Ms": 1.8, "period": 0.5, "time": "0", "speed": "1", "command": "2", "speed_unit": "rpm", "command_unit": "%",
    }  # fmt: skip
    report = service.get(f"/v1/reports/{told['report_id']}").json()
    assert (report["log"]["speed_unit"], report["log"]["command_unit"]) == ("rpm", "%")
    assert (report["options"]["Ms"], report["options"]["period"]) == (1.8, 0.5)
    # What comes with a log goes before what is known of its loop.
    assert keep(service, NAMELESS, query="?Ms=1.3")["options"]["Ms"] == 1.3
    # The zone too: stamps without offset become times.
    assert service.put("/v1/loops/kiln", json={"zone": "Europe/Berlin", "date_order": "dmy"}).status_code == 201
    rows = [f"17.11.2026 06:40:{i // 10:02d},{i % 10}00;{42 + (i > 99)};{590 + (i > 110)}" for i in range(300)]
    log = "\n".join(["time;command [%];speed [rpm]", *rows, ""]).encode()
    report_id = keep(service, log, "kiln")["report_id"]
    assert service.get(f"/v1/reports/{report_id}").json()["log"]["start"] == "2026-11-17T05:40:00Z"


def test_a_unit_that_the_header_contradicts_is_told(service: TestClient, step_test: bytes) -> None:
    service.put("/v1/loops/pan", json={"units": {"speed": "rad/s"}})
    log = service.get(f"/v1/reports/{keep(service, step_test)['report_id']}").json()["log"]
    assert log["speed_unit"] == "rpm"
    assert "unit-differs" in {finding["code"] for finding in log["findings"]}


def test_what_is_known_of_a_loop_comes_back_and_goes_again(service: TestClient) -> None:
    known = {
        "units": {"speed": "rpm", "command": "%"},
        "zone": "Europe/Zurich",
        "date_order": "dmy",
        "installed": {"Kp": 0.075, "Ti": 2.3, "Td": 0.1, "Tf": 0.01, "b": 0.7},
        "period": 0.0,
        "command_limits": {"low": 0, "high": 100},
        "defaults": {"form": "pi", "Ms": 1.5},
    }
    made = service.put("/v1/loops/pan", json=known)
    assert made.status_code == 201
    found = service.get("/v1/loops/pan")
    assert found.json() == made.json()
    for name, value in known.items():
        shown = found.json()[name]
        assert shown == (shown | value if isinstance(value, dict) else value)
    again = service.put("/v1/loops/pan", json=found.json())
    assert (again.status_code, again.json()) == (200, made.json())
    emptied = service.put("/v1/loops/pan", json={})
    assert emptied.json()["installed"] is None


def test_the_settings_told_are_compared_with_those_that_the_log_shows(service: TestClient) -> None:
    # sample_logs/README.md: the panel's PI has Kp = 0.075 %/rpm, Ti = 2.3 s.
    log = (ROOT / "sample_logs" / "setpoint_change.csv").read_bytes()
    for loop, Kp, differs in (("pan", 0.075, False), ("pot", 0.06, True)):
        service.put(f"/v1/loops/{loop}", json={"installed": {"Kp": Kp, "Ti": 2.3}})
        report = service.get(f"/v1/reports/{keep(service, log, loop)['report_id']}").json()
        assert report["installed"]["source"] == "log"
        assert report["installed"]["settings"]["Kp"] == pytest.approx(0.075, rel=1e-3)
        assert ("installed-differs" in {finding["code"] for finding in report["findings"]}) is differs


@pytest.mark.parametrize("told", ["1", "0,2", "1,-1", "a,b", "1,2,3"])
def test_installed_settings_that_make_no_sense_are_refused(service: TestClient, told: str, step_test: bytes) -> None:
    response = service.post("/v1/reports", params={"installed": told}, content=step_test)
    assert "installed" in expect.answer(response, expected=422, code="invalid-option")["evidence"]


@pytest.mark.parametrize(
    ("body", "at"),
    [
        ({"zone": "Mars/Olympus"}, "zone"),
        ({"installed": {"Kp": 0, "Ti": 1}}, "installed.Kp"),
        ({"installed": {"Kp": 1, "Ti": -1}}, "installed.Ti"),
        ({"command_limits": {"low": 5, "high": 5}}, "command_limits"),
        ({"period": 1e6}, "period"),
        ({"colour": "blue"}, "colour"),
        ([1], "body"),
    ],
)
def test_settings_that_make_no_sense_are_refused(service: TestClient, body: Any, at: str) -> None:
    told = expect.answer(service.put("/v1/loops/pan", json=body), expected=422, code="invalid-body")
    assert at in told["evidence"]
    expect.answer(service.get("/v1/loops/pan"), expected=404, code="no-such-loop")


@pytest.mark.parametrize("word", [b"NaN", b"Infinity", b"1e999"])
def test_numbers_that_json_lacks_are_refused(service: TestClient, word: bytes) -> None:
    body = b'{"installed": {"Kp": %s, "Ti": 1}}' % word
    response = service.put("/v1/loops/pan", content=body, headers={"Content-Type": "application/json"})
    expect.answer(response, expected=422, code="invalid-body")


def test_bodies_that_are_no_settings_are_refused(service: TestClient) -> None:
    headers = {"Content-Type": "application/json"}
    cut = service.put("/v1/loops/pan", content=b'{"zone"', headers=headers)
    assert "character" in expect.answer(cut, expected=422, code="invalid-body")["detail"]
    for body in (b" " * 200_000, (b" " * 1000 for _ in range(200))):
        expect.answer(service.put("/v1/loops/pan", content=body, headers=headers), expected=413, code="too-large")


@pytest.mark.parametrize("name", ["R%C3%BChrwerk%203", "pan%3F%23%25", "%E7%AA%AF", "a" * 100])
def test_a_loop_may_be_called_anything_printable(service: TestClient, step_test: bytes, name: str) -> None:
    told = keep(service, step_test, name)
    assert [loop["loop"] for loop in service.get("/v1/loops").json()] == [told["loop"]]
    link = service.get(f"/v1/reports/{told['report_id']}").headers["link"]
    assert link.startswith(f'</v1/loops/{name}>; rel="collection"')
    keep(service, variant(step_test, 18), name)
    assert f"</v1/loops/{name}/logs?limit=1&after=log_" in service.get(f"/v1/loops/{name}/logs?limit=1").headers["link"]


def test_two_spellings_of_one_name_are_one_loop(service: TestClient) -> None:
    # Unicode Standard Annex 15: u with diaeresis, composed and decomposed.
    assert service.put("/v1/loops/R%C3%BChrwerk", json={}).status_code == 201
    assert service.put("/v1/loops/Ru%CC%88hrwerk", json={}).status_code == 200


@pytest.mark.parametrize("name", ["%00", "a%0Ab", "%20a", "a%5Cb", "%FF", "a" * 101, "%E2%80%AE"])
def test_names_that_cannot_be_shown_are_refused(service: TestClient, step_test: bytes, name: str) -> None:
    response = service.post(f"/v1/loops/{name}/logs", content=step_test)
    code = response.json()["code"]
    assert code in {"invalid-loop-name", "invalid-option"}
    expect.answer(response, expected=422, code=code)
    assert service.get("/v1/loops").json() == []
