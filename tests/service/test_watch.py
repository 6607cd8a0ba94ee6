"""History, baseline and drift over HTTP: whatever the order of uploads, the same is said."""

from __future__ import annotations

import random
from collections.abc import Iterator, Sequence
from typing import Any

import expect
import pytest
from conftest import ROOT, apart
from nights import INSTALLED, nights, still
from starlette.testclient import TestClient

import ident
from service.app import create_app
from tests.reference.nightly import Loop

COUNT, FALL = 9, 6  # nights, and the first one after the gain has fallen
LOGS = nights(COUNT, gain={FALL: 0.7})


@pytest.fixture(scope="module")
def service() -> Iterator[TestClient]:
    with TestClient(create_app(apart(workers=2))) as service:
        yield service


def loop(service: TestClient, name: str, logs: Sequence[bytes], *, installed: bool = True) -> list[dict[str, Any]]:
    """A loop with these logs, posted in this order; the answer is its history."""
    known = {"period": 0.1, **({"installed": INSTALLED} if installed else {})}
    assert service.put(f"/v1/loops/{name}", json=known).status_code == 201
    for log in logs:
        posted = service.post(f"/v1/loops/{name}/logs", content=log, headers={"Prefer": "wait=60"})
        assert posted.status_code in {200, 201}, posted.text
        assert posted.json()["status"] == "done", posted.text
    history: list[dict[str, Any]] = service.get(f"/v1/loops/{name}/history").json()
    return history


def watch(service: TestClient, name: str, rows: Sequence[dict[str, Any]]) -> Any:
    """The verdict with these rows of the history as the baseline."""
    ids = [row["report_id"] for row in rows]
    assert service.put(f"/v1/loops/{name}/baseline", json={"report_ids": ids}).json()["baseline"] == sorted(ids)
    return service.get(f"/v1/loops/{name}/drift").json()


def without_setpoint(log: bytes) -> bytes:
    """The same log with its setpoint left out, so that its controller cannot be seen."""
    rows = [line.split(b",") for line in log.splitlines()]
    return b"\n".join(b",".join([time, *rest]) for time, _, *rest in rows)


@pytest.fixture(scope="module")
def fallen(service: TestClient) -> tuple[list[dict[str, Any]], Any]:
    """History and verdict of the loop whose gain falls."""
    history = loop(service, "fallen", LOGS)
    return history, watch(service, "fallen", history[:4])


def test_history_has_a_row_for_each_report(service: TestClient, fallen: tuple[list[dict[str, Any]], Any]) -> None:
    history, _ = fallen
    assert [row["start"] for row in history] == [f"2026-11-{2 + n:02d}T02:00:00Z" for n in range(COUNT)]
    for row in history:
        report = service.get(f"/v1/reports/{row['report_id']}").json()
        fit = report["fits"][report["selected"]]
        assert row["parameters"] == fit["parameters"]
        (first,) = (one for one in report["fits"] if one["model"] == "fopdt")
        assert row["first_order"] == first["parameters"]
        assert (row["fit_percent"], row["rms_residual"]) == (
            fit["statistics"]["fit_percent"],
            fit["statistics"]["rms_residual"],
        )
        assert row["excitation"]["sufficient"]
        assert row["command_movement"]["span"] == report["record"]["excitation"]["command_span"]
        assert row["command_movement"]["unit"] == "%"
        assert row["margins_of"] == "installed"


def test_margins_are_those_of_the_installed_settings(fallen: tuple[list[dict[str, Any]], Any]) -> None:
    history, drift = fallen
    # The plant that made the logs, and what its controller makes of it before and after the fall.
    plant, settings = Loop(), ident.PidSettings(Loop.Kp, Loop.Ti)
    for row, gain in ((history[0], 1.0), (history[-1], 0.7)):
        true = ident.margins(ident.Fopdt(plant.K * gain, plant.T1, plant.L), settings, period=0.1)
        assert row["margins"]["Ms"] == pytest.approx(true.Ms, rel=0.05)
        interval = row["margins_interval"]
        assert interval["ci95"][0] < interval["Ms_median"] < interval["ci95"][1]
        assert interval["Ms_median"] == pytest.approx(row["margins"]["Ms"], rel=0.01)
        assert interval["unstable_share"] == 0.0
    margin = drift["margin"]
    assert margin["ci95"] == history[-1]["margins_interval"]["ci95"]
    assert margin["seen_in"] is None
    assert margin["settings_from"] == "installed"
    assert margin["Ms_now"] == pytest.approx(history[-1]["margins"]["Ms"])
    assert margin["ci95"][0] <= margin["Ms_now"] <= margin["ci95"][1]
    assert margin["target"] == 1.6


def test_a_fall_of_the_gain_is_found_and_dated(fallen: tuple[list[dict[str, Any]], Any]) -> None:
    _, drift = fallen
    assert drift["verdict"] == "moved"
    assert drift["as_of"] == drift["last_informative"] == f"2026-11-{1 + COUNT:02d}T02:00:00Z"
    assert drift["since"] == f"2026-11-{2 + FALL:02d}T02:00:00Z"
    K = drift["parameters"]["K"]
    assert (K["verdict"], K["since"]) == ("moved", drift["since"])
    assert K["statistic"] > K["threshold"]
    assert K["change"] == pytest.approx(-0.3 * Loop.K, rel=0.2)
    assert [night["verdict"] for night in drift["nights"]] == ["not-moved"] * 2 + ["moved"] * 3


def test_the_order_of_uploads_does_not_matter_nor_does_sending_twice(
    fallen: tuple[list[dict[str, Any]], Any],
) -> None:
    history, drift = fallen
    shuffled = [*LOGS, *LOGS[2:5]]
    random.Random(3).shuffle(shuffled)
    with TestClient(create_app(apart(workers=2))) as other:
        again = loop(other, "fallen", shuffled)
        # To the last digit, ids and all.
        assert again == history
        assert watch(other, "fallen", again[:4]) == drift


def test_a_night_that_shows_nothing_is_no_news(service: TestClient) -> None:
    poor = still(COUNT)
    history = loop(service, "poor", [poor, *LOGS])
    assert history[-1]["excitation"]["sufficient"] is False
    assert (history[-1]["model"], history[-1]["parameters"], history[-1]["first_order"]) == (None, {}, {})
    assert (history[-1]["margins"], history[-1]["margins_interval"]) == (None, None)
    drift = watch(service, "poor", history[:4])
    assert drift["verdict"] == "no-news"
    assert {p["verdict"] for p in drift["parameters"].values()} == {"no-news"}
    assert (drift["as_of"], drift["last_informative"]) == (history[-1]["start"], history[-2]["start"])
    # The run of moved nights that it does not end is still on.
    assert drift["since"] == f"2026-11-{2 + FALL:02d}T02:00:00Z"
    assert (drift["margin"]["Ms_now"], drift["margin"]["ci95"]) == (None, [None, None])
    assert drift["nights"][-1]["unusable"]
    refused = service.put("/v1/loops/poor/baseline", json={"report_ids": [history[-1]["report_id"]]})
    expect.answer(refused, expected=422, code="night-unusable")


def test_without_installed_settings_those_that_the_last_log_shows_are_watched(service: TestClient) -> None:
    history = loop(service, "seen", LOGS[:5], installed=False)
    drift = watch(service, "seen", history[:4])
    margin = drift["margin"]
    assert (margin["settings_from"], margin["seen_in"]) == ("log", history[-1]["report_id"])
    # The logs' command is written with four decimals, which is all that stands between them and the controller.
    assert margin["settings"]["Kp"] == pytest.approx(Loop.Kp, rel=0.01)
    assert margin["settings"]["Ti"] == pytest.approx(Loop.Ti, rel=0.01)
    told = ident.margins(ident.Fopdt(Loop.K, Loop.T1, Loop.L), ident.PidSettings(Loop.Kp, Loop.Ti), period=0.1)
    assert margin["Ms_now"] == pytest.approx(told.Ms, rel=0.05)
    assert {row["margins_of"] for row in history} == {"log"}
    assert history[-1]["margins"]["Ms"] == pytest.approx(margin["Ms_now"])
    # A later log in another unit shows a gain that means nothing for the others.
    other = LOGS[5].replace(b"[rpm]", b"[rad/s]")
    service.post("/v1/loops/seen/logs", content=other, headers={"Prefer": "wait=60"})
    rows = service.get("/v1/loops/seen/history").json()
    assert {row["margins_of"] for row in rows} == {"log"}
    assert [row["margins"]["Ms"] for row in rows] == pytest.approx([told.Ms] * 6, rel=0.05)
    assert service.get("/v1/loops/seen/drift").json()["margin"]["settings"] == margin["settings"]


def test_without_any_known_settings_the_baseline_s_proposal_is_watched(service: TestClient) -> None:
    history = loop(service, "unknown", [without_setpoint(log) for log in LOGS[:6]], installed=False)
    assert {(row["margins"], row["margins_of"]) for row in history} == {(None, None)}
    drift = watch(service, "unknown", history[:5])
    assert drift["verdict"] == "not-moved"
    assert drift["margin"]["settings_from"] == "baseline"
    assert drift["margin"]["Ms_baseline"] == pytest.approx(1.6, abs=0.01)
    rows = service.get("/v1/loops/unknown/history").json()
    assert {row["margins_of"] for row in rows} == {"baseline"}
    assert [row["in_baseline"] for row in rows] == [True] * 5 + [False]


def test_a_baseline_alone_says_what_it_is(service: TestClient) -> None:
    history = loop(service, "new", LOGS[:1])
    expect.answer(service.get("/v1/loops/new/drift"), expected=409, code="no-baseline")
    drift = watch(service, "new", history)
    assert (drift["verdict"], drift["as_of"], drift["last_informative"], drift["nights"]) == ("no-news", None, None, [])
    assert drift["parameters"]["K"]["baseline"] == pytest.approx(history[0]["parameters"]["K"]["value"])
    assert "few-baseline-nights" in {finding["code"] for finding in drift["findings"]}
    assert service.put("/v1/loops/new/baseline", json={"report_ids": []}).json()["baseline"] == []
    expect.answer(service.get("/v1/loops/new/drift"), expected=409, code="no-baseline")


def test_only_reports_of_this_loop_and_one_a_log_make_a_baseline(service: TestClient) -> None:
    mine, (other, *_) = loop(service, "mine", LOGS[:1]), loop(service, "other", LOGS[:1])

    def put(*ids: str) -> Any:
        return service.put("/v1/loops/mine/baseline", json={"report_ids": ids})

    expect.answer(put(other["report_id"]), expected=422, code="other-loop")
    expect.answer(put("rep_none"), expected=404, code="no-such-report")
    service.post("/v1/loops/mine/logs?Ms=1.4", content=LOGS[0], headers={"Prefer": "wait=60"})
    twice = [row["report_id"] for row in service.get("/v1/loops/mine/history").json()]
    assert len(twice) == 2
    expect.answer(put(*twice), expected=422, code="same-log")
    assert put(mine[0]["report_id"]).status_code == 200
    refused = service.put("/v1/loops/mine/baseline", json={"report_ids": "all"})
    expect.answer(refused, expected=422, code="invalid-body")


def test_a_log_of_several_reports_counts_once_by_the_last(service: TestClient) -> None:
    history = loop(service, "asked-twice", LOGS[:2])
    service.post("/v1/loops/asked-twice/logs?Ms=1.4", content=LOGS[1], headers={"Prefer": "wait=60"})
    rows = service.get("/v1/loops/asked-twice/history").json()
    assert [row["start"] for row in rows] == [history[0]["start"], history[1]["start"], history[1]["start"]]
    (night,) = watch(service, "asked-twice", history[:1])["nights"]
    assert night["report_id"] == rows[2]["report_id"]


def test_logs_without_a_time_stand_at_their_receipt(service: TestClient) -> None:
    history = loop(service, "undated", nights(3, dated=False))
    assert [row["start"] for row in history] == [None] * 3
    at = [row["at"] for row in history]
    assert at == sorted(at)
    received = [log["received"] for log in service.get("/v1/loops/undated/logs").json()]
    assert at == received
    assert watch(service, "undated", history[:2])["as_of"] == at[2]


def test_gains_in_another_unit_are_not_compared(service: TestClient) -> None:
    other = LOGS[4].replace(b"[rpm]", b"[rad/s]")
    history = loop(service, "units", [*LOGS[:4], other])
    drift = watch(service, "units", history[:3])
    assert [night["verdict"] for night in drift["nights"]] == ["not-moved", "no-news"]
    assert "unit" in drift["nights"][1]["unusable"]


def test_what_counts_as_a_move_can_be_set(service: TestClient) -> None:
    history = loop(service, "wide", LOGS)
    known = service.get("/v1/loops/wide").json()
    assert known["watch"] == {
        "significance": 0.0027,
        "practical": {"K": 0.1, "T": 0.15, "K_per_T": 0.15, "L": 0.2, "L_of_sum": 0.05},
    }
    assert watch(service, "wide", history[:4])["verdict"] == "moved"
    large = dict.fromkeys(known["watch"]["practical"], 5.0)
    service.put("/v1/loops/wide", json={**known, "watch": {"practical": large}})
    drift = service.get("/v1/loops/wide/drift").json()
    assert drift["verdict"] == "not-moved"
    assert drift["parameters"]["K"]["practical"] == pytest.approx(5.0 * drift["parameters"]["K"]["baseline"], rel=0.01)


def test_history_comes_in_pages(service: TestClient, fallen: tuple[list[dict[str, Any]], Any]) -> None:
    history, _ = fallen
    first = service.get("/v1/loops/fallen/history?limit=5")
    link = first.headers["link"]
    assert link.endswith('; rel="next"')
    rest = service.get(link[1:].split(">")[0])
    assert "link" not in rest.headers
    ids = [row["report_id"] for row in [*first.json(), *rest.json()]]
    assert ids == [row["report_id"] for row in history]
    refused = service.get("/v1/loops/fallen/history?after=rep_none")
    expect.answer(refused, expected=422, code="no-such-page")


def test_answers_hold_no_numbers_that_json_lacks(service: TestClient) -> None:
    """Logs at the edge: every number in history and drift is one, or null (expect refuses NaN as it parses)."""
    logs = [(ROOT / "sample_logs" / f"{name}.csv").read_bytes() for name in ("oscillating", "nothing_to_learn")]
    loop(service, "edge", [LOGS[0], *logs, still(3)])
    for path in ("history", "logs", "reports"):
        response = service.get(f"/v1/loops/edge/{path}")
        assert response.status_code == 200
        assert b"NaN" not in response.content
        assert b"Infinity" not in response.content
