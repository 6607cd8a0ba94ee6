"""preview: what was understood, for a person to confirm. Expected values stand in ../shared/odd_logs and its README."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from pydantic import TypeAdapter

from ident import LoopRecord, Preview, ReadError, preview
from ident.record import previewed


def odd(shared: Path, number: str) -> Path:
    return next((shared / "odd_logs").glob(f"{number}_*.csv"))


def test_gap_and_clock_step_with_their_places(shared: Path) -> None:
    p = preview(odd(shared, "19"))
    assert (p.rows, p.rows_used, p.layout, p.encoding, p.delimiter, p.decimal) == (30, 30, "wide", "utf-8", ",", ".")
    assert (p.first_stamp, p.last_stamp) == ("2026-03-02T08:15:00.000Z", "2026-03-02T08:15:31.200Z")
    assert p.start == "2026-03-02T08:15:00Z"
    assert (p.sample_time_s, p.gap_count, p.clock_step_count) == (0.1, 1, 1)
    assert (p.gaps[0].start_s, p.gaps[0].length_s) == (pytest.approx(1.1), pytest.approx(30.1))
    assert (p.clock_steps[0].at_s, p.clock_steps[0].step_s) == (pytest.approx(32.2), pytest.approx(-1.7))
    assert p.jitter_s == pytest.approx(0, abs=1e-12)


def test_columns_say_which_header_became_what_and_why(shared: Path) -> None:
    p = preview(odd(shared, "01"), zone="Europe/Berlin")
    columns = {c.role: c for c in p.columns}
    assert (columns["speed"].header, columns["speed"].unit) == ("Drehzahl [1/min]", "1/min")
    assert columns["speed"].why == 'its header says "drehzahl"'
    assert (columns["command"].lowest, columns["command"].highest, columns["command"].quantum) == (30.0, 39.83, 0.01)
    assert p.start == "2026-03-02T07:15:00Z"
    assert p.first_rows[0] == (0.0, 900.0, 30.0, 900.0)
    named = preview(odd(shared, "01"), columns={"speed": 3})
    assert next(c.why for c in named.columns if c.role == "speed") == "you named it"


def test_rows_left_out_are_counted_by_reason(shared: Path) -> None:
    assert preview(odd(shared, "02")).dropped == {"one filled field": 1}
    assert preview(odd(shared, "06")).dropped == {"bad quality": 5}
    assert preview(odd(shared, "04")).dropped == {"missing value": 9}
    assert [(m.start_s, m.end_s, m.mode) for m in preview(odd(shared, "12")).modes][:2] == [
        (0.0, pytest.approx(0.7), "manual"),
        (pytest.approx(0.8), pytest.approx(1.7), "automatic"),
    ]
    stuck = {c.role: c for c in preview(odd(shared, "23")).columns}
    assert (stuck["command"].at_high, stuck["command"].quantum) == (1.0, None)


@pytest.mark.parametrize("number", ["01", "02", "03", "04", "06", "07", "09", "10", "12", "15", "16", "18", "19", "23"])
def test_it_serialises_as_it_stands(shared: Path, number: str) -> None:
    p = preview(odd(shared, number))
    shape = TypeAdapter(Preview)
    sent = shape.dump_json(p)
    assert shape.validate_json(sent) == p
    assert "NaN" not in sent.decode()
    assert len(json.loads(sent)["findings"]) <= 6  # a handful, never a flood


def test_it_refuses_as_read_csv_does() -> None:
    with pytest.raises(ReadError, match="empty-log"):
        preview(b"")
    with pytest.raises(TypeError):
        previewed(LoopRecord(np.arange(5.0), np.ones(5), np.ones(5)))
