"""The kept path over HTTP: accepted once, analysed once, found again."""

from __future__ import annotations

import gzip
import json
import time
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import expect
import pytest
from conftest import ROOT, apart, own_folder
from lane_tasks import obey
from starlette.testclient import TestClient

from service.api.prefer import LONGEST_S, wait_seconds
from service.app import create_app
from service.cli import main
from service.store.jobs import Job, Jobs
from service.work.stages import STAGES

WAIT = {"Prefer": "wait=60"}
NAMELESS = b"0;590;42\n1;591;42\n" + b"".join(
    b"%d;%d;%d\n" % (i, 590 + 3 * (i > 40), 42 + (i > 40)) for i in range(2, 90)
)


@pytest.fixture
def service() -> Iterator[TestClient]:
    with TestClient(create_app(apart())) as service:
        yield service


def keep(service: TestClient, body: bytes, loop: str = "pan", *, query: str = "", expected: int = 201) -> Any:
    response = service.post(f"/v1/loops/{loop}/logs{query}", content=body, headers=WAIT)
    assert response.status_code == expected, response.text
    return response.json()


def variant(log: bytes, day: int) -> bytes:
    """The same log of another day."""
    assert b"2026-11-17" in log
    return log.replace(b"2026-11-17", b"2026-11-%02d" % day)


def test_a_log_is_accepted_then_analysed_then_known(service: TestClient, step_test: bytes) -> None:
    accepted = service.post("/v1/loops/pan/logs", content=step_test)
    assert accepted.status_code == 202
    analysis = accepted.json()
    assert set(analysis) >= {"id", "loop", "log_id", "status", "stage", "progress", "report_id", "problem"}
    assert (analysis["loop"], analysis["report_id"], analysis["problem"]) == ("pan", None, None)
    assert analysis["status"] in {"queued", "running"}
    assert accepted.headers["location"] == f"/v1/analyses/{analysis['id']}"
    assert accepted.headers["retry-after"] == "1"
    assert "preference-applied" not in accepted.headers

    known = service.post(
        "/v1/loops/pan/logs", content=gzip.compress(step_test), headers={**WAIT, "Content-Encoding": "gzip"}
    )
    assert known.status_code == 200
    assert known.headers["preference-applied"] == "wait=60"
    done = known.json()
    assert (done["id"], done["status"], done["stage"], done["progress"]) == (analysis["id"], "done", "done", 1.0)
    assert service.get(accepted.headers["location"]).json() == done
    assert service.get(f"/v1/reports/{done['report_id']}").json()["selected"] is not None

    assert keep(service, variant(step_test, 18))["status"] == "done"
    (pan,) = service.get("/v1/loops").json()
    assert (pan["loop"], pan["logs"]) == ("pan", 2)


def test_a_kept_report_is_what_the_command_prints(
    service: TestClient, step_test: bytes, capfdbinary: pytest.CaptureFixture[bytes]
) -> None:
    service.put("/v1/loops/pan", json={"period": 0.02, "defaults": {"Ms": 1.4}})
    kept = service.get(f"/v1/reports/{keep(service, step_test)['report_id']}")
    assert kept.headers["content-type"] == "application/json"
    assert main(["report", str(ROOT / "sample_logs" / "step_test.csv"), "--period=0.02", "--Ms=1.4"]) == 0
    assert capfdbinary.readouterr().out == kept.content
    assert service.post("/v1/reports?Ms=1.4&period=0.02", content=step_test).content == kept.content


def test_other_options_are_another_analysis_of_the_same_log(service: TestClient, step_test: bytes) -> None:
    first = keep(service, step_test)
    other = keep(service, step_test, query="?Ms=1.4")
    assert other["log_id"] == first["log_id"]
    assert other["report_id"] != first["report_id"]
    assert (first["options"], other["options"]) == ({}, {"Ms": 1.4})
    # A default that is spelt out asks for nothing else.
    assert keep(service, step_test, query="?Ms=1.6&form=pi", expected=200)["id"] == first["id"]
    (log,) = service.get("/v1/loops/pan/logs").json()
    assert [asked["id"] for asked in log["analyses"]] == [first["id"], other["id"]]
    assert len(service.get("/v1/loops/pan/reports").json()) == 2


def test_twenty_at_once_are_one(service: TestClient, step_test: bytes) -> None:
    with ThreadPoolExecutor(12) as pool:
        answers = list(pool.map(lambda _: service.post("/v1/loops/pan/logs", content=step_test), range(12)))
    assert sorted(answer.status_code for answer in answers) == [200] * 11 + [202]
    assert len({answer.json()["id"] for answer in answers}) == 1
    keep(service, step_test, expected=200)
    assert len(service.get("/v1/loops/pan/logs").json()) == 1
    assert len(service.get("/v1/loops/pan/history").json()) == 1


def test_a_log_that_cannot_be_read_is_kept_and_says_why(service: TestClient) -> None:
    failed = keep(service, b"speed\n1\n2\n")
    assert (failed["status"], failed["stage"], failed["report_id"]) == ("failed", "failed", None)
    assert failed["problem"]["code"] == "one-column"
    assert failed["problem"]["detail"] == service.post("/v1/reports", content=b"speed\n1\n2\n").json()["detail"]
    assert keep(service, b"speed\n1\n2\n", expected=200) == failed
    assert service.get("/v1/loops/pan/history").json() == []


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


@pytest.mark.parametrize(
    ("path", "code"),
    [
        ("/v1/loops/none", "no-such-loop"),
        ("/v1/loops/none/logs", "no-such-loop"),
        ("/v1/loops/none/reports", "no-such-loop"),
        ("/v1/loops/none/history", "no-such-loop"),
        ("/v1/loops/none/drift", "no-such-loop"),
        ("/v1/analyses/none", "no-such-analysis"),
        ("/v1/reports/none", "no-such-report"),
        ("/v1/loops/a/b", "not-found"),
    ],
)
def test_what_is_not_there_is_a_problem(service: TestClient, path: str, code: str) -> None:
    expect.answer(service.get(path), expected=404, code=code)


def test_lists_come_in_pages(service: TestClient) -> None:
    for name in "cabde":
        service.put(f"/v1/loops/{name}", json={})
    at: str | None = "/v1/loops?limit=2"
    seen = []
    while at:
        response = service.get(at)
        seen.append([loop["loop"] for loop in response.json()])
        link = response.headers.get("link")
        # RFC 8288: <address>; rel="next"
        at = link.removeprefix("<").split(">")[0] if link else None
        assert link is None or link.endswith('; rel="next"')
    assert seen == [["a", "b"], ["c", "d"], ["e"]]
    expect.answer(service.get("/v1/loops/a/logs?after=log_none"), expected=422, code="no-such-page")
    expect.answer(service.get("/v1/loops?limit=0"), expected=422, code="invalid-option")


HELD = "held-for-95-percent"


def _own(tunings: list[dict[str, Any]], held: int) -> list[dict[str, Any]]:
    apart = {"worst_case"} | ({"realisations"} if held else set())
    return [{k: v for k, v in t.items() if k not in apart} for t in tunings if t["method"] != HELD]


@pytest.mark.parametrize("model", ["fopdt", "sopdt", "arx"])
def test_another_proposal_comes_from_the_kept_fit(service: TestClient, step_test: bytes, model: str) -> None:
    report = keep(service, step_test, query=f"?period=0.02&model={model}")["report_id"]
    kept = service.get(f"/v1/reports/{report}").json()
    assert kept["fits"][kept["selected"]]["model"] == model
    same = service.post(f"/v1/reports/{report}/tunings", json={})
    assert same.status_code == 200
    # With nothing asked for it is the report's own, to the last digit. Settings held on drawn plants need the draws,
    # which no report keeps: where they are recommended, the next ones are, and carry the coefficients instead.
    held = [t["method"] for t in kept["tunings"]].count(HELD)
    assert held == (1 if model == "sopdt" else 0)  # two lags are more than this log of one shows
    assert _own(same.json()["tunings"], held) == _own(kept["tunings"], held)
    assert same.json()["recommended"] == (0 if held else kept["recommended"])
    calm = service.post(f"/v1/reports/{report}/tunings", json={"Ms": 1.4, "form": "pi"}).json()
    fresh = service.post(f"/v1/reports?period=0.02&Ms=1.4&model={model}", content=step_test).json()
    held = [t["method"] for t in fresh["tunings"]].count(HELD)
    assert _own(calm["tunings"], held) == _own(fresh["tunings"], held)
    assert calm["options"]["Ms"] == 1.4
    refused = service.post(f"/v1/reports/{report}/tunings", json={"Ms": 0.5})
    expect.answer(refused, expected=422, code="invalid-body")
    expect.answer(service.post("/v1/reports/none/tunings", json={}), expected=404, code="no-such-report")


def test_a_report_without_a_fit_has_nothing_to_tune(service: TestClient) -> None:
    poor = (ROOT / "sample_logs" / "nothing_to_learn.csv").read_bytes()
    report = keep(service, poor)["report_id"]
    expect.answer(service.post(f"/v1/reports/{report}/tunings", json={}), expected=422, code="no-fit")


def test_a_log_that_kills_its_worker_has_failed_after_three_attempts_and_may_try_again() -> None:
    with TestClient(create_app(apart(), task=obey)) as service:
        failed = keep(service, b"die")
        assert (failed["status"], failed["problem"]["code"]) == ("failed", "cut-off")
        # A process after each of the first two; the third is replaced when there is something to do.
        assert "gainwright_workers_replaced 2.0" in service.get("/metrics").text
        refused = keep(service, b"refuse")
        assert refused["problem"]["code"] == "refused-by-test"
        assert refused["problem"]["evidence"] == {"Ms": 1.6}
        again = service.post("/v1/loops/pan/logs", content=b"die")
        assert (again.status_code, again.json()["id"]) == (200, failed["id"])
        assert again.json()["status"] in {"queued", "running"}


def test_the_stage_is_the_worker_s_own_word() -> None:
    with TestClient(create_app(apart(), task=obey)) as service:
        told = service.post("/v1/loops/pan/logs", content=b"fitting").json()
        end = time.monotonic() + 20
        while told["stage"] != "fitting" and time.monotonic() < end:
            time.sleep(0.05)
            told = service.get(f"/v1/analyses/{told['id']}").json()
        assert (told["status"], told["stage"], told["progress"]) == ("running", "fitting", 0.2)
        # Waiting ends when the time is up, and says how it stands.
        begun = time.monotonic()
        waited = service.post("/v1/loops/pan/logs", content=b"fitting", headers={"Prefer": "wait=1"})
        assert 0.9 < time.monotonic() - begun < 20
        assert (waited.status_code, waited.json()["status"]) == (200, "running")
        assert waited.headers["preference-applied"] == "wait=1"


def test_the_stages_of_a_log_come_in_order_and_end_with_storing(
    service: TestClient, step_test: bytes, monkeypatch: pytest.MonkeyPatch
) -> None:
    told: list[tuple[str, float]] = []
    renew = Jobs.renew

    def listen(jobs: Jobs, job: Job, stage: str, progress: float, now: datetime, lease: timedelta) -> bool:
        told.append((stage, progress))
        return renew(jobs, job, stage, progress, now, lease)

    monkeypatch.setattr(Jobs, "renew", listen)
    ended = keep(service, step_test, "stages")
    assert (ended["stage"], ended["progress"]) == ("done", 1.0)
    # A quick worker passes some of them between two looks.
    assert told == sorted(told, key=lambda one: STAGES.index(one[0]))
    assert [share for _, share in told] == sorted(share for _, share in told)
    assert told[-1] == ("storing", 0.8)


def test_a_stop_in_order_leaves_the_rest_for_the_next_start(step_test: bytes) -> None:
    folder = own_folder()
    with TestClient(create_app(apart(data_dir=folder), task=obey)) as service:
        hung = service.post("/v1/loops/pan/logs", content=b"hang").json()
        waiting = service.post("/v1/loops/pan/logs", content=step_test).json()
        end = time.monotonic() + 20
        while service.get(f"/v1/analyses/{hung['id']}").json()["status"] != "running" and time.monotonic() < end:
            time.sleep(0.05)
        assert service.get(f"/v1/analyses/{hung['id']}").json()["stage"] == "reading"
        assert service.get(f"/v1/analyses/{waiting['id']}").json()["status"] == "queued"
    with TestClient(create_app(apart(data_dir=folder))) as service:
        # To the real thing b"hang" is no log.
        ended = keep(service, b"hang", expected=200)
        assert (ended["id"], ended["status"]) == (hung["id"], "failed")
        assert keep(service, step_test, expected=200)["status"] == "done"


def test_settings_and_logs_survive_a_restart(step_test: bytes) -> None:
    folder: Path = own_folder()
    with TestClient(create_app(apart(data_dir=folder))) as service:
        service.put("/v1/loops/pan", json={"zone": "UTC"})
        kept = keep(service, step_test)
        body = service.get(f"/v1/reports/{kept['report_id']}").content
    with TestClient(create_app(apart(data_dir=folder))) as service:
        assert service.get("/v1/loops/pan").json()["zone"] == "UTC"
        assert service.get(f"/v1/reports/{kept['report_id']}").content == body
        assert keep(service, step_test, expected=200) == kept
        assert json.loads(body)["log"]["sha256"] == service.get("/v1/loops/pan/logs").json()[0]["sha256"]


@pytest.mark.parametrize(
    ("headers", "seconds"),
    [
        ([], None),
        (["wait=5"], 5),
        (["respond-async, WAIT=10"], 10),
        (["respond-async", 'wait="7"; x=1'], 7),
        (["wait=2, wait=9"], 2),
        (["wait=99999"], LONGEST_S),
        (["wait"], None),
        (["wait=-1"], None),
        (["wait=1.5"], None),
        (["waiting=3"], None),
    ],
)
def test_preferences_are_read_as_rfc_7240_has_them(headers: list[str], seconds: int | None) -> None:
    assert wait_seconds(headers) == seconds
