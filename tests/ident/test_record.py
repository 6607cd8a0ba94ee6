"""LoopRecord: what it keeps, what it leaves out, what it refuses. Facts follow from the contract's words."""

from __future__ import annotations

import dataclasses
import pickle
from datetime import UTC, datetime, timedelta, timezone

import numpy as np
import pytest

from ident import IdentError, LoopRecord
from ident.record import Exclusion, Segment

NAN = float("nan")


def make(n: int = 10, **changes: object) -> LoopRecord:
    columns: dict[str, object] = {"time": np.arange(n) * 0.5, "command": np.ones(n), "speed": np.arange(n) * 1.0}
    return LoopRecord(**{**columns, **changes})  # type: ignore[arg-type]


def test_time_starts_at_zero_and_positions_work_as_in_the_contract() -> None:
    r = LoopRecord([5.0, 5.5, 6.0], [1, 2, 3], [4, 5, 6], [7, 8, 9], speed_unit="rpm", command_unit="V")
    assert r.time.tolist() == [0.0, 0.5, 1.0]
    assert r.setpoint is not None
    assert (r.command.tolist(), r.speed.tolist(), r.setpoint.tolist()) == ([1, 2, 3], [4, 5, 6], [7, 8, 9])
    assert (r.rows, r.duration, r.sample_time, r.segments) == (3, 1.0, 0.5, (Segment(0, 3, 0.5),))
    assert (r.start, r.end, r.source) == (None, None, None)


def test_columns_are_read_only_copies() -> None:
    mine = np.ones(4)
    r = LoopRecord(np.arange(4.0), mine, mine)
    mine[0] = 99.0
    assert r.command[0] == 1.0
    with pytest.raises(ValueError, match="read-only"):
        r.command[0] = 2.0
    with pytest.raises(dataclasses.FrozenInstanceError):
        r.speed_unit = "rpm"  # type: ignore[misc]


def test_missing_values_are_left_out_with_their_reason_and_split() -> None:
    speed = np.arange(10.0)
    command = np.ones(10)
    speed[3:5] = NAN
    command[5] = NAN
    r = make(speed=speed, command=command)
    assert r.excluded == (Exclusion(3, 6, "missing value"),)
    assert [(s.start, s.stop) for s in r.segments] == [(0, 3), (6, 10)]


def test_a_missing_setpoint_leaves_no_row_out() -> None:
    assert make(setpoint=[NAN] * 10).segments == (Segment(0, 10, 0.5),)


def test_a_single_row_between_gaps_is_left_out() -> None:
    speed = np.arange(10.0)
    speed[[3, 5]] = NAN
    r = make(speed=speed)
    assert [(s.start, s.stop) for s in r.segments] == [(0, 3), (6, 10)]
    assert Exclusion(4, 5, "single row between gaps") in r.excluded


def test_callers_exclusions_join_and_rows_are_named_once() -> None:
    speed = np.arange(10.0)
    speed[2:5] = NAN
    r = make(speed=speed, excluded=(Exclusion(0, 3, "motor off"),))
    assert r.excluded == (Exclusion(0, 3, "motor off"), Exclusion(3, 5, "missing value"))
    assert r.segments == (Segment(5, 10, 0.5),)


def test_replace_and_pickle_give_the_same_record() -> None:
    speed = np.arange(10.0)
    speed[[3, 5]] = NAN
    r = make(speed=speed, start=datetime(2026, 3, 2, tzinfo=UTC))
    for again in (pickle.loads(pickle.dumps(r)), dataclasses.replace(r, speed_unit="rpm")):
        assert (again.excluded, again.segments, again.start) == (r.excluded, r.segments, r.start)
        np.testing.assert_array_equal(again.speed, r.speed)
        assert not again.speed.flags.writeable


def test_start_is_kept_in_utc_and_end_follows() -> None:
    r = make(start=datetime(2026, 3, 2, 9, 15, tzinfo=timezone(timedelta(hours=1))))
    assert r.start == datetime(2026, 3, 2, 8, 15, tzinfo=UTC)
    assert r.start.utcoffset() == timedelta(0)
    assert r.end == datetime(2026, 3, 2, 8, 15, 4, 500000, tzinfo=UTC)


def test_sample_time_is_that_of_most_rows() -> None:
    time = np.concatenate((np.arange(50) * 0.1, 100 + np.arange(8) * 0.15))
    assert make(58, time=time).sample_time == 0.1


@pytest.mark.parametrize(
    ("changes", "code", "said"),
    [
        ({"command": np.ones(9)}, "length-mismatch", "time 10, command 9, speed 10"),
        ({"speed": [np.inf] * 10}, "not-finite", "Row 0 of speed is inf"),
        ({"time": [0, 1, 2, NAN, 4, 5, 6, 7, 8, 9]}, "not-finite", "Row 3 of time is nan"),
        ({"time": [0, 1, 2, 2, 4, 5, 6, 7, 8, 9]}, "time-not-increasing", "at row 3"),
        ({"time": [0, 1, 2, 3, 4, 5, 1, 7, 8, 9]}, "time-not-increasing", "at row 6"),
        ({"start": datetime(2026, 3, 2)}, "naive-start", "time zone"),
        ({"excluded": (Exclusion(-3, 2, "x"),)}, "exclusion-out-of-range", "here -3 to 2"),
        ({"excluded": (Exclusion(3, 11, "x"),)}, "exclusion-out-of-range", "here 3 to 11"),
    ],
)
def test_refusals_name_the_place(changes: dict[str, object], code: str, said: str) -> None:
    with pytest.raises(IdentError) as caught:
        make(**changes)
    assert caught.value.code == code
    assert said in caught.value.message


def test_one_row_is_no_record() -> None:
    with pytest.raises(IdentError) as caught:
        LoopRecord([0.0], [1.0], [1.0])
    assert caught.value.code == "too-few-rows"
