"""Odd logs, by what is odd about their time: stamps, offsets, order of rows, gaps, clocks that were set.

Expected: ../shared/odd_logs/README.md. Kinds without a file there are written here by its description.
"""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from odd_step import CO, PV, SP, START, codes, finding, is_the_step, iso, odd, rows, text

from ident import read_csv


def test_08_offsets_that_change_at_the_end_of_summer_time() -> None:
    begin = datetime(2026, 10, 25, 0, 58, tzinfo=UTC)
    table = rows()
    for k, row in enumerate(table):
        at = begin + timedelta(seconds=10 * k)
        hours = 2 if k < 12 else 1
        row[0] = (at + timedelta(hours=hours)).strftime(f"%Y-%m-%dT%H:%M:%S+0{hours}:00")
    r = read_csv(text(table))
    np.testing.assert_array_equal(r.time, np.arange(30) * 10.0)
    assert (r.start, codes(r), len(r.segments)) == (begin, [], 1)


@pytest.mark.parametrize("zone", [None, "Europe/Berlin"])
def test_11_spreadsheet_days(zone: str | None) -> None:
    # Days since 1899-12-30, eight decimals (ECMA-376, 18.17.4: 1900 date base, with its false leap day).
    table = rows()
    for k, row in enumerate(table):
        row[0] = f"{46083 + (8.25 * 3600 + k / 10) / 86400:.8f}"
    r = read_csv(text(table), zone=zone)
    is_the_step(r)
    assert r.sample_time == 0.1
    assert r.start == (START - timedelta(hours=1) if zone else None)
    assert codes(r) == ([] if zone else ["zone-unknown"])
    assert r.source is not None
    assert r.source.understood is not None
    assert r.source.understood.first.startswith("2026-03-02T08:15:00.000" if not zone else "2026-03-02T07:15:00.000Z")


def test_14_rows_swapped_repeated_and_in_conflict() -> None:
    table = rows()
    table[10], table[11] = table[11], table[10]
    table.insert(16, list(table[15]))
    table.insert(22, [*table[21][:3], "1.0"])
    r = read_csv(text(table))
    is_the_step(r)
    assert codes(r) == ["rows-sorted", "dropped-duplicates", "conflicting-rows"]
    assert finding(r, "rows-sorted").evidence == {"count": 1, "first_line": 13}
    assert finding(r, "dropped-duplicates").evidence == {"count": 1, "first_line": 18}
    assert finding(r, "conflicting-rows").evidence == {"count": 1, "first_line": 24}


def test_14_a_buffered_block_that_came_late_and_a_log_turned_upside_down() -> None:
    table = rows()
    r = read_csv(text([*table[:10], *table[14:25], *table[10:14], *table[25:]]))
    is_the_step(r)
    assert finding(r, "rows-sorted").evidence == {"count": 4, "first_line": 23}
    r = read_csv(text(table[::-1]))
    is_the_step(r)
    assert (r.start, codes(r)) == (START, ["rows-reversed"])


def test_15_one_second_stamps_are_spread_evenly(shared: Path) -> None:
    r = read_csv(odd(shared, "15"), zone="UTC")
    is_the_step(r)
    assert (r.sample_time, r.start, codes(r)) == (0.1, START, ["stamps-spread"])
    # A log that begins and ends within a second, 0.3 s apart: 3 or 4 rows a second.
    at = 0.75 + 0.3 * np.arange(40)
    table = [[f"{int(t)}", "1", str(k)] for k, t in enumerate(at)]
    r = read_csv(text(table, "time [s],CO,PV"))
    np.testing.assert_allclose(np.diff(r.time), 0.3, rtol=0.02)


def test_19_a_gap_and_a_clock_set_back_split_the_record(shared: Path) -> None:
    r = read_csv(odd(shared, "19"))
    assert [(s.start, s.stop, s.step) for s in r.segments] == [(0, 12, 0.1), (12, 22, 0.1), (22, 30, 0.1)]
    assert r.breaks == (22,)
    np.testing.assert_allclose(r.time, np.arange(30) / 10 + 30.0 * (np.arange(30) >= 12), atol=1e-9)
    assert r.speed.tolist() == PV  # in the order of the rows: no half sorted into the other
    assert finding(r, "gap").evidence["largest_s"] == pytest.approx(30.1)
    step = finding(r, "clock-step").evidence
    assert (step["count"], step["line"], step["step_s"]) == (1, 24, pytest.approx(-1.7))
    assert r.source is not None
    assert r.source.understood is not None
    assert r.source.understood.last == "2026-03-02T08:15:31.200Z"


@pytest.mark.parametrize("back", [0.7, 1.7, 1.73, 25.0])
@pytest.mark.parametrize("late", [False, True])
def test_19_a_small_clock_step_in_a_long_log_is_not_sorted_away(back: float, late: bool) -> None:
    at = np.arange(4000) / 10 - np.where(np.arange(4000) >= 2500, back, 0.0)
    table = [[f"{t:.2f}", str(k % 7), str(k)] for k, t in enumerate(at)]
    if late:
        table[100], table[101] = table[101], table[100]
    r = read_csv(text(table, "time,CO,PV"))
    assert r.speed.tolist() == list(range(4000))
    assert (r.breaks, [(s.start, s.stop) for s in r.segments]) == ((2500,), [(0, 2500), (2500, 4000)])
    np.testing.assert_allclose(r.time, np.arange(4000) / 10, atol=1e-9)
    assert finding(r, "clock-step").evidence["step_s"] == pytest.approx(-back)
    assert ("rows-sorted" in codes(r)) == late


def test_20_pairs_of_time_and_value_of_unlike_length() -> None:
    sp = [(iso(k), str(SP[k])) for k in (0, 8)]
    out = [(iso(k), str(CO[k])) for k in range(30) if k == 0 or CO[k] != CO[k - 1]]
    pv = [(iso(k), str(PV[k])) for k in range(30)]
    lines = ["Time,Plant/Drive/SIC101.SP,Time,Plant/Drive/SIC101.OUT,Time,Plant/Drive/SIC101.PV"]
    lines += [",".join(",".join(p[k]) if k < len(p) else "," for p in (sp, out, pv)) for k in range(30)]
    r = read_csv("\n".join(lines).encode())
    is_the_step(r)
    assert (r.start, r.sample_time) == (START, 0.1)
    assert r.source is not None
    assert r.source.understood is not None
    assert r.source.understood.layout == "paired"
    own = finding(r, "own-clocks")
    assert (own.severity, own.evidence["largest_lag_s"], own.evidence["moves_lost"]) == ("info", 0.0, 0)


@pytest.mark.parametrize(
    ("stamp", "options"),
    [
        ("%d.%m.%y %H:%M:%S.%f", {}),
        ("%m/%d/%y %H:%M:%S.%f", {"date_order": "mdy"}),
        ("%y-%m-%d %H:%M:%S.%f", {"date_order": "ymd"}),
        ("%d-%b-%Y %H:%M:%S.%f", {}),
        ("%d %B %Y %I:%M:%S.%f %p", {}),
        ("%b %d, %Y %H:%M:%S.%f", {}),
        ("%Y%m%dT%H%M%S.%f", {}),
        ("%d.%m.%Y %H:%M:%S:%f", {}),
    ],
)
def test_more_ways_to_write_a_stamp(stamp: str, options: dict[str, str]) -> None:
    table = rows()
    for k, row in enumerate(table):
        row[0] = '"' + (START + timedelta(seconds=k / 10)).strftime(stamp) + '"'
    r = read_csv(text(table), zone="UTC", **options)  # type: ignore[arg-type]
    is_the_step(r)
    assert r.start == START
    assert codes(r) == (["two-digit-years"] if "%y" in stamp else [])


def test_times_of_day_past_midnight() -> None:
    table = rows()
    for k, row in enumerate(table):
        row[0] = (datetime(2026, 3, 2, 23, 59, 58, 500000) + timedelta(seconds=k / 10)).strftime("%H:%M:%S.%f")
    r = read_csv(text(table))
    is_the_step(r)
    assert codes(r) == ["date-unknown"]


def test_a_row_without_a_stamp_is_dropped_and_counted() -> None:
    table = rows()
    table[5][0] = ""
    r = read_csv(text(table))
    is_the_step(r, left_out=(5,))
    assert finding(r, "rows-without-time").evidence == {"count": 1, "first_line": 7}
