"""Each kind of odd log: its times, values and findings, not merely that it parses.

Expected: ../shared/odd_logs/README.md. Kinds without a file there are written here by its description, from the
same step: 30 rows, 0.1 s apart, 900 to 1200 rpm at row 8.
"""

from __future__ import annotations

import csv
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest

from ident import Finding, LoopRecord, ReadError, read_csv
from ident.record import Exclusion, ModeSpan

START = datetime(2026, 3, 2, 8, 15, tzinfo=UTC)
SP = [900.0] * 8 + [1200.0] * 22
CO = [
    *[30.0] * 8, 38.0, 37.48, 37.49, 37.69, 37.94, 38.2, 38.44, 38.65, 38.83, 38.99, 39.13, 39.25, 39.36, 39.44, 39.52,
    39.59, 39.64, 39.69, 39.74, 39.77, 39.8, 39.83,
]  # fmt: skip
PV = [
    900.0, 900.4, 899.6, 898.7, 899.3, 898.5, 900.1, 902.0, 899.3, 993.5, 1046.3, 1077.2, 1098.1, 1112.4, 1126.4,
    1138.0, 1143.8, 1152.7, 1156.9, 1163.4, 1167.4, 1174.0, 1175.9, 1181.3, 1183.8, 1185.5, 1183.9, 1188.7, 1190.8,
    1192.3,
]  # fmt: skip


def iso(k: int, step: float = 0.1) -> str:
    return f"{START + timedelta(seconds=k * step):%Y-%m-%dT%H:%M:%S.%f}"[:-3] + "Z"


def rows() -> list[list[str]]:
    return [[iso(k), str(SP[k]), str(CO[k]), str(PV[k])] for k in range(30)]


def text(table: list[list[str]], head: str = "Time,SP,CO,PV") -> bytes:
    return "\n".join([head, *(",".join(row) for row in table), ""]).encode()


def codes(record: LoopRecord) -> list[str]:
    assert record.source is not None
    return [f.code for f in record.source.findings]


def finding(record: LoopRecord, code: str) -> Finding:
    assert record.source is not None
    (found,) = (f for f in record.source.findings if f.code == code)
    return found


def is_the_step(record: LoopRecord, left_out: tuple[int, ...] = ()) -> None:
    kept = [k for k in range(30) if k not in left_out]
    np.testing.assert_allclose(record.time, np.array(kept) / 10, rtol=0, atol=1e-12)
    assert record.setpoint is not None
    assert record.setpoint.tolist() == [SP[k] for k in kept]
    assert record.command.tolist() == [CO[k] for k in kept]
    assert record.speed.tolist() == [PV[k] for k in kept]


def odd(shared: Path, number: str) -> Path:
    return next((shared / "odd_logs").glob(f"{number}_*.csv"))


def test_the_step_here_is_the_one_there(shared: Path) -> None:
    with odd(shared, "10").open() as file:
        table = list(csv.reader(file))[1:]
    assert [[float(c) for c in row[1:]] for row in table] == [list(row) for row in zip(SP, CO, PV, strict=True)]


def test_03_long_format_each_tag_on_its_own_clock(shared: Path) -> None:
    r = read_csv(odd(shared, "03"))
    with odd(shared, "03").open() as file:
        reports = [(row["TagName"], row["Timestamp"], float(row["Value"])) for row in csv.DictReader(file)]

    def at(stamp: str) -> float:
        return (datetime.fromisoformat(stamp) - datetime.fromisoformat("2026-03-02T08:15:00.100Z")).total_seconds()

    # The speed's own rows from where the command is known, the last report of the others before each.
    speed = [(at(t), v) for tag, t, v in reports if tag == "SIC101.PV" and at(t) >= 0]
    np.testing.assert_allclose(r.time, [t for t, _ in speed], atol=1e-9)
    assert r.speed.tolist() == [v for _, v in speed]
    for tag, values in (("SIC101.OP", r.command), ("SIC101.SP", r.setpoint)):
        held = [[v for g, s, v in reports if g == tag and at(s) <= t + 1e-9][-1] for t, _ in speed]
        assert values is not None
        assert values.tolist() == held
    assert r.start == START + timedelta(milliseconds=100)
    assert r.source is not None
    assert r.source.columns == {
        "time": "Timestamp", "command": "SIC101.OP", "speed": "SIC101.PV", "setpoint": "SIC101.SP",
    }  # fmt: skip
    assert r.source.understood is not None
    assert r.source.understood.layout == "long"
    own = finding(r, "own-clocks")
    assert own.evidence["largest_lag_s"] == pytest.approx(0.063)
    assert own.evidence["rows_before_all_signals"] == 1


def test_03_sorted_by_tag_and_with_a_second_loop_needs_names(shared: Path) -> None:
    lines = odd(shared, "03").read_text().splitlines()
    by_tag = "\n".join([lines[0], *sorted(lines[1:])]).encode()
    np.testing.assert_array_equal(read_csv(by_tag).speed, read_csv(odd(shared, "03")).speed)
    two = "\n".join([*lines, *(line.replace("SIC101", "SIC102") for line in lines[1:])]).encode()
    with pytest.raises(ReadError) as caught:
        read_csv(two)
    assert caught.value.code == "ambiguous-columns"
    named = {"setpoint": "SIC101.SP", "command": "SIC101.OP", "speed": "SIC101.PV"}
    r = read_csv(two, columns=named)
    np.testing.assert_array_equal(r.speed, read_csv(odd(shared, "03")).speed)
    assert finding(r, "signals-unused").evidence == {"count": 3}


def test_05_opc_da_quality_leaves_out_by_quality_and_tells_limits() -> None:
    quality = [192] * 30
    quality[3], quality[4], quality[6], quality[20], quality[21] = 0, 64, 216, 193, 194
    table = [[*row, str(q)] for row, q in zip(rows(), quality, strict=True)]
    table[3][3] = "0.0"
    r = read_csv(text(table, "Time,SP,CO,PV,Quality"))
    assert [(e.start, e.stop) for e in r.excluded if e.reason == "bad quality"] == [(3, 5), (6, 7)]
    assert 0.0 not in np.concatenate([r.speed[s.slice] for s in r.segments])
    assert finding(r, "bad-quality").evidence == {"column": "Quality", "count": 3, "first_line": 5}
    assert finding(r, "limit-flags").evidence == {"column": "Quality", "low": 1, "high": 1}


@pytest.mark.parametrize(("head", "code"), [("Quality", "status-ambiguous"), ("StatusCode", None)])
def test_06_a_status_of_zeros_is_asked_for_and_the_log_kept(head: str, code: str | None) -> None:
    r = read_csv(text([[*row, "0"] for row in rows()], f"Time,SP,CO,PV,{head}"))
    is_the_step(r)
    assert r.excluded == ()
    assert codes(r) == ([code] if code else [])


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


def test_09_reports_on_change_are_held_and_the_deadband_is_said(shared: Path) -> None:
    path = odd(shared, "09")
    with path.open() as file:
        table = list(csv.DictReader(file))
    r = read_csv(path)
    times = [(datetime.fromisoformat(row["Time"]) - START).total_seconds() for row in table]
    np.testing.assert_allclose(r.time, times, atol=1e-9)
    for key, values in (("SP", r.setpoint), ("CO", r.command), ("PV", r.speed)):
        held, last = [], ""
        for row in table:
            last = row[key] or last
            held.append(float(last))
        assert values is not None
        assert values.tolist() == held
    assert codes(r) == ["exception-reported", "irregular-sampling"]
    said = finding(r, "exception-reported").evidence
    reports = np.array([float(row["PV"]) for row in table if row["PV"]])
    assert said["deadband"] == pytest.approx(np.abs(np.diff(reports)).min())
    assert 4.0 <= said["deadband"] < 4.5  # the deadband was 4 rpm
    assert said["rows_held"] == 1
    missing = read_csv(path, blanks="missing")
    assert np.isnan(missing.command).sum() == 10
    assert "exception-reported" not in codes(missing)


def test_09_a_setpoint_logged_where_it_changes() -> None:
    table = rows()
    for k in range(30):
        table[k][1] = {0: "900.0", 8: "1200.0"}.get(k, "")
    r = read_csv(text(table))
    is_the_step(r)
    assert finding(r, "setpoint-held").evidence == {"reports": 2}


def test_blanks_beside_repeated_values_are_missing_not_held() -> None:
    table = rows()
    for k in (4, 5, 6, 7, 22, 23, 24):
        table[k][2] = ""
    r = read_csv(text(table))
    assert np.flatnonzero(np.isnan(r.command)).tolist() == [4, 5, 6, 7, 22, 23, 24]
    assert '"blanks"' in finding(r, "missing-values").message


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


def test_12_modes_and_a_setpoint_that_tracks_the_speed(shared: Path) -> None:
    r = read_csv(odd(shared, "12"))
    assert r.modes == (
        ModeSpan(0, 8, "manual"),
        ModeSpan(8, 18, "automatic"),
        ModeSpan(18, 22, "manual"),
        ModeSpan(22, 26, "automatic"),
        ModeSpan(26, 30, "cascade"),
    )
    assert r.setpoint is not None
    manual = [*range(8), *range(18, 22)]
    assert np.flatnonzero(np.isnan(r.setpoint)).tolist() == manual
    assert set(np.delete(r.setpoint, manual)) == {1200.0}
    assert r.speed.tolist() == PV
    assert finding(r, "setpoint-tracks-speed").evidence == {"count": 12}
    unknown = read_csv(odd(shared, "12").read_bytes().replace(b"CAS", b"FROB"))
    assert (unknown.modes, codes(unknown)) == ((), ["mode-ignored"])


@pytest.mark.parametrize(("bits", "sign"), [(16, 1), (16, -1), (32, 1)])
def test_13_encoder_counts_that_roll_over(bits: int, sign: int) -> None:
    turns = np.cumsum(np.array(PV) * 0.1 / 60.0)
    position = 2**bits - sign * 3000 + np.round(sign * turns * 1024).astype(int)
    table = [[row[0], row[1], row[2], str(p % 2**bits)] for row, p in zip(rows(), position, strict=True)]
    with pytest.raises(ReadError) as caught:
        read_csv(text(table, "Time,SP,CO,Encoder [counts]"))
    assert caught.value.code == "counts-per-rev-missing"
    r = read_csv(text(table, "Time,SP,CO,Encoder [counts]"), counts_per_rev=1024)
    quantum = 60 / (1024 * 0.1)  # 0.586 rpm
    assert np.isnan(r.speed[0])
    np.testing.assert_allclose(r.speed[1:], 60 * np.diff(position) / (1024 * 0.1), rtol=1e-9)
    np.testing.assert_allclose(r.speed[1:], sign * np.array(PV[1:]), atol=quantum)
    assert (r.speed_unit, r.segments[0].start) == ("rpm", 1)
    said = finding(r, "encoder-counts").evidence
    assert said["quantum_rpm"] == pytest.approx(0.586, abs=5e-4)
    assert (said["rollovers"], said["modulus"]) == (1, 2**bits)


def test_13_no_speed_is_made_up_across_a_gap() -> None:
    table = [[iso(k), "1", str(k * 50)] for k in [*range(20), *range(60, 80)]]
    r = read_csv(text(table, "Time,CO,PV"), counts_per_rev=1000)
    assert np.flatnonzero(np.isnan(r.speed)).tolist() == [0, 20]
    assert set(np.round(r.speed[np.isfinite(r.speed)], 9)) == {30.0}
    with pytest.raises(ReadError, match="not-counts"):
        read_csv(text(rows()), counts_per_rev=1024)


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


def test_16_thousands_and_units_in_cells(shared: Path) -> None:
    r = read_csv(odd(shared, "16"))
    is_the_step(r)
    assert (r.speed_unit, r.command_unit) == ("rpm", "%")
    assert finding(r, "units-in-cells").evidence == {"unit: setpoint": "rpm", "unit: command": "%"}


def test_16_the_other_convention_and_mixed_units() -> None:
    table = [[row[0], *(f"{float(c):,.1f}".translate(str.maketrans(",.", ".,")) for c in row[1:])] for row in rows()]
    for k in range(30):
        table[k][2] = f'"{CO[k]}"'.replace(".", ",")
    r = read_csv("\n".join(["Time;SP;CO;PV", *(";".join(row) for row in table)]).encode())
    np.testing.assert_array_equal(r.speed, PV)
    np.testing.assert_array_equal(r.setpoint, SP)
    mixed = rows()
    for k in range(30):
        mixed[k][3] += " rpm" if k % 2 else " rad/s"
    assert finding(read_csv(text(mixed)), "mixed-units").severity == "error"


def test_units_of_setpoint_and_speed_that_differ() -> None:
    table = rows()
    for row in table:
        row[1] = f"{float(row[1]) * np.pi / 30:.12f}"
    r = read_csv(text(table, "Time,SP [rad/s],CO [%],PV [rpm]"))
    np.testing.assert_allclose(r.setpoint, SP, rtol=1e-9)
    assert finding(r, "units-converted").evidence == {"setpoint_unit": "rad/s", "speed_unit": "rpm"}
    r = read_csv(text(rows(), "Time,SP [%],CO [%],PV [rpm]"))
    assert finding(r, "units-differ").severity == "warning"
    assert codes(read_csv(text(rows(), "Time,SP [1/min],CO [%],PV [rpm]"))) == []


def test_17_utf16_tab() -> None:
    body = text(rows(), "Time,SP,CO,PV").decode().replace(",", "\t").replace("\n", "\r\n")
    r = read_csv(b"\xff\xfe" + body.encode("utf-16-le"))
    is_the_step(r)
    assert (r.start, codes(r)) == (START, [])
    assert r.source is not None
    assert r.source.understood is not None
    assert (r.source.understood.encoding, r.source.understood.delimiter) == ("utf-16-le", "\t")


def test_18_nul_bytes_in_the_middle_drop_their_line() -> None:
    body = text(rows()).split(b"\n")
    body[6] = body[6][:20] + b"\0" * 50
    r = read_csv(b"\n".join(body))
    is_the_step(r, left_out=(5,))
    assert [(s.start, s.stop) for s in r.segments] == [(0, 5), (5, 29)]
    assert finding(r, "nul-bytes").evidence == {"count": 50}


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


def test_an_oscilloscope_export() -> None:
    # Times before the trigger, channel names, scientific notation, an 8-bit converter (256 steps over 10 V).
    t = np.arange(-500, 1500) * 2e-5
    volts = np.round(np.clip(1 - np.exp(-np.maximum(t, 0) / 5e-3), 0, 1) * 8 / (10 / 256)) * (10 / 256) - 4
    lines = ["Model,DS-X", "Record Length,2000", "TIME,CH1,CH2"]
    lines += [f"{a:+.6e},{5.0 if a >= 0 else 0.0:.4e},{v:.6e}" for a, v in zip(t, volts, strict=True)]
    r = read_csv("\n".join(lines).encode(), columns={"command": "CH1", "speed": "CH2"})
    np.testing.assert_allclose(r.time, t - t[0], atol=1e-12)
    np.testing.assert_allclose(r.speed, volts, rtol=1e-6)
    assert (r.sample_time, set(r.command)) == (2e-5, {0.0, 5.0})
    assert finding(r, "coarse-quantisation").evidence["quantum"] == pytest.approx(10 / 256, rel=1e-4)


def test_a_speed_refreshed_slower_than_it_is_logged() -> None:
    rng = np.random.default_rng(4)
    shown = np.repeat(900 + rng.normal(0, 5, 60).cumsum(), 5)
    table = [[f"{k / 10:.1f}", str(30 + k % 7), f"{v:.4f}"] for k, v in enumerate(shown)]
    said = finding(read_csv(text(table, "time,CO,PV")), "slow-refresh")
    assert said.evidence == {"rows": 5, "step_s": pytest.approx(0.1)}


def test_a_command_driven_into_its_limit_twice() -> None:
    wave = np.clip(60 + 60 * np.sin(np.arange(300) / 20), 0, 85)
    table = [[f"{k / 10:.1f}", f"{u:.2f}", f"{k % 13}"] for k, u in enumerate(wave)]
    said = finding(read_csv(text(table, "time,CO,PV")), "command-saturated")
    assert (said.evidence["value"], said.evidence["share"]) == (85.0, pytest.approx(np.mean(wave == 85), abs=0.01))


def test_combined_semicolons_preamble_quality_and_rows_out_of_order() -> None:
    table = [[*row, "Good"] for row in rows()]
    table[4][4] = "Bad"
    table[10], table[11] = table[11], table[10]
    body = [";".join([row[0], *(c.replace(".", ",") for c in row[1:])]) for row in table]
    lines = ["Trend export", "Station 4", "", "Time;SP;CO;PV;Quality", ";rpm;%;rpm;", *body, "*** end ***"]
    r = read_csv("\r\n".join(lines).encode("utf-8-sig"))
    is_the_step(r)
    assert (r.speed_unit, r.command_unit, r.start) == ("rpm", "%", START)
    assert [e for e in r.excluded if e.reason == "bad quality"] == [Exclusion(4, 5, "bad quality")]
    assert codes(r) == ["dropped-lines", "bad-quality", "rows-sorted"]


def test_ragged_lines_and_open_quotes_are_dropped_and_counted() -> None:
    lines = text(rows()).decode().splitlines()
    lines[6] += ",7"
    lines[9] = lines[9].rsplit(",", 1)[0]
    lines[12] = lines[12].replace(",", ',"', 1)
    r = read_csv("\n".join([*lines, ""]).encode())
    is_the_step(r, left_out=(5, 8, 11))
    assert finding(r, "ragged-rows").evidence == {"count": 3, "first_line": 7}
    assert r.source is not None
    assert r.source.rows == 30


def test_a_row_without_a_stamp_is_dropped_and_counted() -> None:
    table = rows()
    table[5][0] = ""
    r = read_csv(text(table))
    is_the_step(r, left_out=(5,))
    assert finding(r, "rows-without-time").evidence == {"count": 1, "first_line": 7}
