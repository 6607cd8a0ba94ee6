"""report_bytes: same bytes and options, same JSON; nothing is raised across the process border."""

from __future__ import annotations

import json
import pickle

import pytest

import ident
from service.errors import Problem
from service.work import report
from service.work.options import Options
from service.work.stages import enter


def test_the_same_log_gives_the_same_bytes(step_test: bytes) -> None:
    first = report.report_bytes(step_test, Options())
    assert isinstance(first, bytes)
    assert first == report.report_bytes(step_test, Options())
    told = json.loads(first, parse_constant=pytest.fail)
    assert told["report_version"] == "1"
    assert told["log"]["rows"] == step_test.count(b"\n") - 1


def test_a_refusal_is_a_value_that_survives_pickling() -> None:
    answer = report.report_bytes(b"", Options())
    assert isinstance(answer, Problem)
    assert pickle.loads(pickle.dumps(answer)) == answer


@pytest.mark.parametrize("raised", [SystemExit(3), ValueError("boom"), MemoryError(), GeneratorExit()])
def test_whatever_goes_wrong_is_a_value(
    raised: BaseException, monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    def fail(*_: object, **__: object) -> None:
        raise raised

    monkeypatch.setattr(ident, "read_csv", fail)
    answer = report.report_bytes(b"a,b", Options())
    assert isinstance(answer, Problem)
    assert answer.code == "internal"
    assert type(raised).__name__ in caplog.text


def test_an_error_of_ident_keeps_its_code_and_evidence(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object, **__: object) -> None:
        raise ident.IdentError("some-code", "A sentence.", {"line": 3})

    monkeypatch.setattr(ident, "read_csv", refuse)
    assert report.report_bytes(b"a,b", Options()) == Problem("some-code", "A sentence.", {"line": 3})


def test_every_option_reaches_ident(monkeypatch: pytest.MonkeyPatch) -> None:
    seen: dict[str, object] = {}

    def read(source: bytes, **options: object) -> str:
        seen.update(options, source=source)
        return "record"

    def analyse(record: str, **options: object) -> None:
        seen.update(options, record=record)
        raise ident.IdentError("enough", "Enough was seen.")

    monkeypatch.setattr(ident, "read_csv", read)
    monkeypatch.setattr(ident, "analyse", analyse)
    options = Options.model_validate(
        {
            "model": "arx",
            "Ms": "1.4",
            "form": "pid",
            "goal": "load",
            "period": "0",
            "installed": "0.1,2",
            "command_limits": "0,100",
            "zone": "Europe/Zurich",
            "date_order": "mdy",
            "start": "2026-03-01T06:00:00Z",
            "counts_per_rev": "1024",
            "time": "0",
            "speed": "n [rpm]",
        }
    )
    report.report_bytes(b"a,b", options)
    assert seen == {
        "source": b"a,b",
        "record": "record",
        "columns": {"time": 0, "speed": "n [rpm]"},
        "zone": "Europe/Zurich",
        "date_order": "mdy",
        "start": options.start,
        "counts_per_rev": 1024.0,
        "model": "arx",
        "Ms": 1.4,
        "form": "pid",
        "goal": "load",
        "period": 0.0,
        "installed": ident.PidSettings(0.1, 2.0),
        "command_limits": (0.0, 100.0),
        "on_stage": enter,
    }
