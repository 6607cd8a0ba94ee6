"""Odd logs, by what stands in their columns: layouts, quality, modes, counts, units, words.

Expected: ../shared/odd_logs/README.md. Kinds without a file there are written here by its description.
"""

from __future__ import annotations

import csv
from datetime import datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from odd_step import CO, PV, SP, START, codes, finding, is_the_step, iso, odd, rows, text

from ident import ReadError, read_csv
from ident.record import ModeSpan


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
