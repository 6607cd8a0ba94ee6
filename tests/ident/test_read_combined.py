"""Oddities together: a log with several of them is read as each alone would be."""

from __future__ import annotations

from datetime import timedelta
from zoneinfo import ZoneInfo

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from odd_step import START, codes, finding, is_the_step, rows, text

from ident import read_csv
from ident.record import Exclusion


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


HEADERS = {
    "en": ("Time", "Setpoint", "Controller output", "Measured speed", "Quality"),
    "tags": ("Timestamp", "SIC101.SP", "SIC101.OUT", "SIC101.PV", "Status"),
    "de": ("Zeitstempel", "Sollwert", "Stellgröße", "Istdrehzahl", "Qualität"),
    "fr": ("Horodatage", "Consigne", "Commande", "Vitesse mesurée", "Qualité"),
}
PREAMBLES = {
    "none": [],
    "title": ["Trend export", ""],
    "pairs": ["Station 4", "Exported: 2026-03-02 09:00", "Period,from,to", ""],
}
ODD = ("units", "local", "quality", "swap", "repeat", "footer", "cut", "gap", "nuls")
level = st.integers(-90_000, 90_000).map(lambda k: k / 8)  # exact in few digits
BERLIN = ZoneInfo("Europe/Berlin")


@settings(max_examples=150, deadline=None)
@given(
    values=st.lists(st.tuples(level, level, level), min_size=24, max_size=40),
    dialect=st.sampled_from([(";", ","), (";", "."), ("\t", ","), (",", ".")]),
    language=st.sampled_from(sorted(HEADERS)),
    preamble=st.sampled_from(sorted(PREAMBLES)),
    odd=st.fixed_dictionaries({name: st.booleans() for name in ODD}),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "cp1252"]),
    newline=st.sampled_from(["\n", "\r\n"]),
)
def test_any_oddities_together_give_the_same_record(
    values: list[tuple[float, float, float]],
    dialect: tuple[str, str],
    language: str,
    preamble: str,
    odd: dict[str, bool],
    encoding: str,
    newline: str,
) -> None:
    delimiter, decimal = dialect
    at = 0.5 * np.arange(len(values)) + 60.0 * (odd["gap"] & (np.arange(len(values)) >= 12))
    table = []
    for t, row in zip(at, values, strict=True):
        stamp = START + timedelta(seconds=float(t))
        text = f"{stamp.astimezone(BERLIN):%d.%m.%Y %H:%M:%S.%f}" if odd["local"] else f"{stamp:%Y-%m-%dT%H:%M:%S.%f}Z"
        table.append([text, *(repr(v).replace(".", decimal) for v in row), *["Good"] * odd["quality"]])
    if odd["quality"]:
        table[4] = [table[4][0], *["0"] * 3, "Bad"]
    lines = [delimiter.join(row) for row in table]
    if odd["repeat"]:
        lines.insert(20, lines[19])
    if odd["swap"]:
        lines[8], lines[9] = lines[9], lines[8]
    head = [*HEADERS[language][:4], *[HEADERS[language][4]] * odd["quality"]]
    units = ["", "rpm", "%", "rpm", *[""] * odd["quality"]]
    above = [*PREAMBLES[preamble], delimiter.join(head), *[delimiter.join(units)] * odd["units"]]
    whole = newline.join([*above, *lines, *["*** end ***"] * odd["footer"], ""])
    if odd["cut"]:
        whole += lines[-1].rsplit(delimiter, 1)[0]  # the power went while this line was written
    raw = whole.encode(encoding)
    if odd["nuls"] and encoding != "utf-16":
        raw += b"\0" * 64
    record = read_csv(raw, zone="Europe/Berlin")

    assert record.start == START
    np.testing.assert_allclose(record.time, at, rtol=0, atol=1e-9)
    setpoint, command, speed = (np.array(column) for column in zip(*values, strict=True))
    good = np.arange(len(values)) != (4 if odd["quality"] else -1)
    assert record.setpoint is not None
    np.testing.assert_array_equal(record.setpoint[good], setpoint[good])
    np.testing.assert_array_equal(record.command[good], command[good])
    np.testing.assert_array_equal(record.speed[good], speed[good])
    bad = [(e.start, e.stop) for e in record.excluded if e.reason == "bad quality"]
    assert bad == ([(4, 5)] if odd["quality"] else [])
    edges = [0, *[4, 5] * odd["quality"], *[12, 12] * odd["gap"], len(values)]
    assert [(s.start, s.stop) for s in record.segments] == list(zip(edges[::2], edges[1::2], strict=True))
    assert (record.speed_unit, record.command_unit) == (("rpm", "%") if odd["units"] else ("", ""))
    said = set(codes(record))
    assert ("rows-sorted" in said) == odd["swap"]
    assert ("dropped-duplicates" in said) == odd["repeat"]
    assert ("gap" in said) == odd["gap"]
    assert ("bad-quality" in said) == odd["quality"]
    assert ("truncated-tail" in said) == (odd["cut"] or (odd["nuls"] and encoding != "utf-16"))
