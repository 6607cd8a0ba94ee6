"""read_csv on measured logs and on logs as plants write them; expected values stand in the files themselves.

Sources: ../shared/datasets (measured records) and ../shared/odd_logs (one invented 900 to 1200 rpm step).
"""

from __future__ import annotations

import hashlib
import io
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import pytest

from ident import Finding, LoopRecord, ReadError, read_csv

# The step that most files of ../shared/odd_logs hold: 30 rows, 0.1 s apart, moved at row 8.
START = datetime(2026, 3, 2, 8, 15, tzinfo=UTC)


def codes(record: LoopRecord) -> list[str]:
    assert record.source is not None
    return [f.code for f in record.source.findings]


# What signals look like is tested on its own.
LOOKS = {"coarse-quantisation", "slow-refresh"}


def is_the_step(record: LoopRecord) -> None:
    np.testing.assert_array_equal(record.time, np.arange(30) / 10)
    assert record.setpoint is not None
    assert record.setpoint.tolist() == [900.0] * 8 + [1200.0] * 22
    assert record.command[[0, 7, 8, 9, 29]].tolist() == [30.0, 30.0, 38.0, 37.48, 39.83]
    assert record.speed[[0, 1, 8, 9, 29]].tolist() == [900.0, 900.4, 899.3, 993.5, 1192.3]
    assert record.sample_time == 0.1
    assert len(record.segments) == 1


@pytest.mark.parametrize(
    "name",
    [
        "bldc_chirp", "dryer_pt326", "gas_furnace_bj", "hoop_motor_random", "hslu_dcmotor_open_noload",
        "hslu_dcmotor_pi_noload", "hslu_dcmotor_pid_noload", "mouse_pid1_limitcycle", "mouse_pid2_disturbed",
        "mouse_pid6", "un_dcmotor_prbs", "un_dcmotor_step",
    ],
)  # fmt: skip
def test_measured_logs_are_read_without_loss(shared: Path, name: str) -> None:
    path = shared / "datasets" / f"{name}.csv"
    header = path.read_text().splitlines()[0].split(",")
    table = dict(zip(header, np.loadtxt(path, delimiter=",", skiprows=1).T, strict=True))
    r = read_csv(path)
    np.testing.assert_array_equal(r.time, table["t_s"] - table["t_s"][0])
    np.testing.assert_array_equal(r.command, table["command"])
    np.testing.assert_array_equal(r.speed, table["output"])
    assert (r.setpoint is None) == ("setpoint" not in table)
    if r.setpoint is not None:
        np.testing.assert_array_equal(r.setpoint, table["setpoint"])
    assert r.source is not None
    assert r.source.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert r.source.rows == r.rows == len(table["t_s"])
    assert r.source.columns["speed"] == "output"
    assert r.excluded == ()
    irregular = name in {"bldc_chirp", "mouse_pid6"}
    assert [c for c in codes(r) if c not in LOOKS] == ["date-unknown", *["irregular-sampling"] * irregular]


def finding(record: LoopRecord, code: str) -> Finding:
    assert record.source is not None
    return next(f for f in record.source.findings if f.code == code)


def odd(shared: Path, number: str) -> Path:
    return next((shared / "odd_logs").glob(f"{number}_*.csv"))


def test_01_semicolons_decimal_commas_and_german_headers(shared: Path) -> None:
    r = read_csv(odd(shared, "01"))
    is_the_step(r)
    assert (r.start, r.speed_unit, r.command_unit) == (None, "1/min", "%")
    assert codes(r) == ["zone-unknown"]
    assert r.source is not None
    assert r.source.columns == {
        "time": "Zeit", "setpoint": "Sollwert [1/min]", "command": "Stellgröße [%]", "speed": "Drehzahl [1/min]",
    }  # fmt: skip
    there = read_csv(odd(shared, "01"), zone="Europe/Berlin")
    assert there.start == datetime(2026, 3, 2, 7, 15, tzinfo=UTC)
    assert codes(there) == []


def test_02_preamble_units_row_and_footer(shared: Path) -> None:
    r = read_csv(odd(shared, "02"))
    is_the_step(r)
    assert (r.start, r.speed_unit, r.command_unit) == (START, "rpm", "%")
    assert r.source is not None
    (footer,) = r.source.findings
    assert (footer.code, footer.evidence) == ("dropped-lines", {"count": 1, "first_line": 36})


def test_04_state_words_become_missing_and_are_counted(shared: Path) -> None:
    r = read_csv(odd(shared, "04"))
    assert np.flatnonzero(np.isnan(r.speed)).tolist() == [5, 6, 11, 12, 17, 18, 19, 24, 25]
    assert {e.reason for e in r.excluded} <= {"missing value", "single row between gaps"}
    assert r.source is not None
    (missing,) = r.source.findings
    assert missing.code == "missing-values"
    assert (missing.evidence["count"], missing.evidence["blank"], missing.evidence["word: Bad"]) == (9, 1, 1)


def test_06_opc_ua_severity_leaves_rows_out_by_quality_not_by_value(shared: Path) -> None:
    # OPC UA: the top two bits of the StatusCode, 0 good, 1 uncertain, 2 bad (../shared/odd_logs/README.md).
    path = odd(shared, "06")
    status = [int(row.rsplit(",", 1)[1]) for row in path.read_text().splitlines()[1:]]
    r = read_csv(path)
    np.testing.assert_array_equal(r.speed, read_csv(odd(shared, "10")).speed)
    out = {k for e in r.excluded if e.reason == "bad quality" for k in range(e.start, e.stop)}
    assert out == {k for k, s in enumerate(status) if s >= 2**30 or s >> 16 == 0x96}
    assert r.source is not None
    (found,) = r.source.findings
    assert (found.code, found.evidence["count"], found.evidence["first_line"]) == ("bad-quality", 5, 9)


@pytest.mark.parametrize(
    ("column", "left_out"),
    [
        (["192"] * 12, []),
        (["192", "192", "0", "64", "193", "216", *["192"] * 6], [2, 3, 5]),
        (["Good"] * 6 + ["Bad [comm]", "Uncertain"] + ["good"] * 4, [6, 7]),
        ([""] * 12, None),
        (["RUN"] * 6 + ["STOP"] * 6, None),
    ],
)
def test_quality_columns(column: list[str], left_out: list[int] | None) -> None:
    rows = [f"{k / 10:.1f},1,{k},{q}" for k, q in enumerate(column)]
    r = read_csv(table(*rows, head="time,command,speed,Quality"))
    out = [k for e in r.excluded if e.reason == "bad quality" for k in range(e.start, e.stop)]
    assert out == (left_out or [])
    assert ("status-ignored" in codes(r)) == (left_out is None)
    assert ("bad-quality" in codes(r)) == bool(left_out)


def test_07_local_hour_that_comes_twice(shared: Path) -> None:
    r = read_csv(odd(shared, "07"))
    assert (r.start, r.breaks, [(s.start, s.stop) for s in r.segments]) == (None, (12,), [(0, 12), (12, 24)])
    np.testing.assert_array_equal(r.time, np.arange(24) * 10.0)
    step = finding(r, "clock-step")
    assert (step.evidence, '"zone"' in step.message) == ({"count": 1, "line": 14, "step_s": -3600.0}, True)
    r = read_csv(odd(shared, "07"), zone="Europe/Berlin")
    np.testing.assert_array_equal(r.time, np.arange(r.rows) * 10.0)
    assert r.start == datetime(2026, 10, 25, 0, 58, tzinfo=UTC)  # still +02:00


def test_10_epoch_milliseconds(shared: Path) -> None:
    r = read_csv(odd(shared, "10"))
    is_the_step(r)
    assert (r.start, codes(r)) == (START, [])


def test_16_thousands_and_units_in_cells(shared: Path) -> None:
    is_the_step(read_csv(odd(shared, "16")))


def test_18_power_cut_drops_the_cut_line(shared: Path) -> None:
    r = read_csv(odd(shared, "18"))
    assert (r.rows, r.command[-1], r.time[-1]) == (29, 39.8, 2.8)
    assert codes(r) == ["truncated-tail"]


def test_21_dates_that_no_row_decides(shared: Path) -> None:
    with pytest.raises(ReadError) as caught:
        read_csv(odd(shared, "21"))
    assert caught.value.code == "ambiguous-dates"
    for order, day in (("mdy", (3, 2)), ("dmy", (2, 3))):
        r = read_csv(odd(shared, "21"), date_order=order, zone="UTC")
        is_the_step(r)
        assert r.start == datetime(2026, *day, 8, 15, tzinfo=UTC)


def test_22_no_header_by_position(shared: Path) -> None:
    where = {"time": 0, "setpoint": 1, "command": 2, "speed": 3}
    r = read_csv(odd(shared, "22"), columns=where, start="2026-03-02T08:15:00Z")
    is_the_step(r)
    assert (r.start, codes(r)) == (START, [])
    is_the_step(read_csv(odd(shared, "22"), columns={k: str(v) for k, v in where.items()}))
    with pytest.raises(ReadError) as caught:
        read_csv(odd(shared, "22"))
    assert caught.value.code == "missing-column"
    assert "no header row" in caught.value.message


def test_23_a_flat_log_is_readable(shared: Path) -> None:
    r = read_csv(odd(shared, "23"))
    assert (r.rows, set(r.command.tolist()), codes(r)) == (30, {100.0}, ["command-saturated", "speed-frozen"])
    assert finding(r, "speed-frozen").evidence["share"] == pytest.approx(26 / 30)


def table(*rows: str, head: str = "time,command,speed") -> bytes:
    return "\n".join((head, *rows)).encode()


ROWS = [f"{k * 0.1:.1f},{k % 3},{100 + k}" for k in range(10)]


def test_path_bytes_and_file_are_the_same_log(tmp_path: Path) -> None:
    path = tmp_path / "log.csv"
    path.write_bytes(table(*ROWS))
    records = [read_csv(s) for s in (path, str(path), table(*ROWS), io.BytesIO(table(*ROWS)))]
    assert len({r.source.sha256 for r in records if r.source}) == 1
    for r in records:
        np.testing.assert_array_equal(r.speed, np.arange(100.0, 110.0))


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-32", "utf-16-le"])
def test_encodings_with_a_mark_are_read_without_a_finding(encoding: str) -> None:
    text = table(*ROWS, head="Zeit [s],Stellgröße [%],Drehzahl [1/min]").decode()
    mark = b"\xff\xfe" if encoding == "utf-16-le" else b""
    r = read_csv(mark + text.encode(encoding))
    assert (r.command_unit, codes(r)) == ("%", ["date-unknown"])


def test_windows_1252_is_read_and_said() -> None:
    r = read_csv(table(*ROWS, head="Zeit [s],Stellgröße [%],Drehzahl [1/min]").decode().encode("cp1252"))
    assert codes(r) == ["encoding-assumed", "date-unknown"]
    assert r.source is not None
    assert r.source.columns["command"] == "Stellgröße [%]"


@pytest.mark.parametrize("newline", ["\n", "\r\n", "\r"])
def test_line_ends_and_blank_lines(newline: str) -> None:
    text = table(*ROWS[:4], "", *ROWS[4:], "", "").decode().replace("\n", newline)
    r = read_csv(text.encode())
    assert (r.rows, r.time[-1]) == (10, 0.9)


def test_a_cut_last_line_is_dropped() -> None:
    r = read_csv(table(*ROWS, "1.0,2"))
    assert (r.rows, codes(r)) == (10, ["truncated-tail", "date-unknown"])


def test_an_empty_setpoint_column_is_no_setpoint() -> None:
    r = read_csv(table(*[f"{k / 10:.1f},,1,{k}" for k in range(10)], head="time,setpoint,command,speed"))
    assert r.setpoint is None
    assert codes(r) == ["missing-values", "date-unknown"]


def test_words_in_the_first_rows_are_rows() -> None:
    rows = [f"{k / 10:.1f},No Data,{'Bad' if k < 6 else k}" if k < 8 else f"{k / 10:.1f},1,{k}" for k in range(20)]
    r = read_csv(table(*rows))
    assert (r.rows, r.excluded[0].stop, r.segments[0].start) == (20, 8, 8)


def test_a_blank_line_below_the_header_and_an_unknown_units_row() -> None:
    assert read_csv(table("", *ROWS)).rows == 10
    r = read_csv(table("[x],[furlongs],[per week]", *ROWS))
    assert (r.rows, codes(r)) == (10, ["unread-lines", "date-unknown"])


def test_exact_repetitions_are_dropped() -> None:
    r = read_csv(table(*ROWS[:5], ROWS[4], ROWS[4], *ROWS[5:]))
    assert r.rows == 10
    assert r.source is not None
    assert r.source.rows == 12
    found = next(f for f in r.source.findings if f.code == "dropped-duplicates")
    assert found.evidence == {"count": 2, "first_line": 7}


def test_gaps_are_counted_with_the_largest_and_its_place() -> None:
    times = [0.0, 0.1, 0.2, 0.3, 0.8, 0.9, 1.0, 3.0, 3.1, 3.2]
    r = read_csv(table(*[f"{t},1,{k}" for k, t in enumerate(times)]))
    assert [(s.start, s.stop) for s in r.segments] == [(0, 4), (4, 7), (7, 10)]
    assert r.source is not None
    gap = next(f for f in r.source.findings if f.code == "gap")
    assert gap.evidence == {"count": 2, "largest_s": 2.0, "at_s": 3.0, "line": 9}


def test_output_beside_command_is_the_speed_and_beside_speed_the_command() -> None:
    assert read_csv(table(*ROWS, head="time,command,output")).command[2] == 2.0
    assert read_csv(table(*ROWS, head="time,output,speed")).command[2] == 2.0
    assert read_csv(table(*ROWS, head="t,u,y")).speed[2] == 102.0
    assert read_csv(table(*ROWS, head="t,input,output")).speed[2] == 102.0


def test_columns_by_name_beat_the_vocabulary() -> None:
    r = read_csv(table(*ROWS, head="time,speed,CV"), columns={"command": "speed", "speed": " cv "})
    assert (r.command[2], r.speed[2]) == (2.0, 102.0)


@pytest.mark.parametrize(
    ("head", "stamp", "h"),
    [
        ("time [ms]", lambda k: f"{10 * k}", 0.01),
        ("t_us", lambda k: f"{1000 * k}", 0.001),
        ("time [min]", lambda k: f"{0.5 * k}", 30.0),
        ("timestamp", lambda k: f"{1772439300 + k / 100:.2f}", 0.01),
        ("timestamp", lambda k: f"{1772439300000000 + 250 * k}", 0.00025),
        ("timestamp", lambda k: f"{1772439300000000000 + 250 * k}", 0.00000025),
    ],
)
def test_elapsed_and_epoch_units(head: str, stamp: object, h: float) -> None:
    rows = [f"{stamp(k)},1,{k}" for k in range(20)]  # type: ignore[operator]
    r = read_csv(table(*rows, head=f"{head},command,speed"))
    np.testing.assert_allclose(r.time, np.arange(20) * h, rtol=1e-15, atol=0)
    assert r.start == (START if head == "timestamp" else None)


def test_whole_numbers_without_a_unit_are_seconds_with_a_warning() -> None:
    r = read_csv(table(*[f"{10 * k},1,{k}" for k in range(20)]))
    assert r.sample_time == 10.0
    assert "time-unit-assumed" in codes(r)


@pytest.mark.parametrize(
    ("stamp", "start"),
    [
        ("2026-03-02T08:15:{:06.3f}Z", START),
        ("2026-03-02 09:15:{:06.3f}+01:00", START),
        ("2026-03-02T09:15:{:06.3f}+0100", START),
        ("02.03.2026 08:15:{:06.3f}", None),
        ("13/03/2026 08:15:{:06.3f}", None),
        ("3/13/2026 8:15:{:06.3f} AM", None),
        ("08:15:{:06.3f}", None),
    ],
)
def test_written_stamps(stamp: str, start: datetime | None) -> None:
    r = read_csv(table(*[f"{stamp.format(k / 10)},1,{k}" for k in range(20)]))
    np.testing.assert_array_equal(r.time, np.arange(20) / 10)
    assert r.start == start


def test_utc_in_the_header_is_a_zone() -> None:
    rows = [f"2026-03-02 08:15:{k:02d},1,{k}" for k in range(20)]
    assert read_csv(table(*rows, head="Time (UTC),command,speed")).start == START
