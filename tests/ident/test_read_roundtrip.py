"""Round trip: a record written in any dialect reads back as the same numbers, bit for bit."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ident import read_csv

HEADERS = {
    "en": ("Time", "Setpoint", "Controller output", "Measured speed"),
    "tags": ("Timestamp", "SIC101.SP", "SIC101.OUT", "SIC101.PV"),
    "de": ("Zeitstempel", "Sollwert [1/min]", "Stellgröße [%]", "Istdrehzahl [1/min]"),
    "fr": ("Horodatage", "Consigne (tr/min)", "Commande (%)", "Vitesse mesurée (tr/min)"),
    "es": ("Tiempo", "Consigna [rpm]", "Mando [%]", "Velocidad [rpm]"),
    "it": ("Tempo", "Riferimento", "Comando", "Velocità"),
}
BEGIN = datetime(2026, 3, 14, 8, 15, 0, 250000, tzinfo=UTC)
BERLIN = ZoneInfo("Europe/Berlin")
STAMPS = {
    "elapsed": lambda ms: f"{ms / 1000:.3f}",
    "epoch_s": lambda ms: f"{BEGIN.timestamp() + ms / 1000:.3f}",
    "epoch_ms": lambda ms: f"{round(BEGIN.timestamp() * 1000) + ms}",
    "iso_z": lambda ms: f"{BEGIN + timedelta(milliseconds=ms):%Y-%m-%dT%H:%M:%S.%f}Z",
    "iso_offset": lambda ms: (BEGIN + timedelta(milliseconds=ms)).astimezone(BERLIN).isoformat(timespec="milliseconds"),
    "iso_local": lambda ms: f"{(BEGIN + timedelta(milliseconds=ms)).astimezone(BERLIN):%Y-%m-%d %H:%M:%S.%f}",
    "dotted": lambda ms: f"{(BEGIN + timedelta(milliseconds=ms)).astimezone(BERLIN):%d.%m.%Y %H:%M:%S.%f}",
    "month_first": lambda ms: f"{(BEGIN + timedelta(milliseconds=ms)).astimezone(BERLIN):%m/%d/%Y %I:%M:%S.%f %p}",
}  # fmt: skip

number = st.floats(-1e6, 1e6, allow_subnormal=False) | st.sampled_from([0.0, -0.0, 1e-300, 1.7976931348623157e308])


@settings(max_examples=200, deadline=None)
@given(
    rows=st.lists(st.tuples(number, number, number), min_size=5, max_size=12),
    step_ms=st.integers(1, 5000),
    dialect=st.sampled_from([(",", "."), (";", "."), (";", ","), ("\t", "."), ("\t", ",")]),
    language=st.sampled_from(sorted(HEADERS)),
    stamp=st.sampled_from(sorted(STAMPS)),
    order=st.permutations(range(4)),
    setting=st.tuples(
        st.booleans(),
        st.booleans(),
        st.sampled_from(["\n", "\r\n"]),
        st.sampled_from(["utf-8", "utf-8-sig", "utf-16"]),
    ),
)
def test_any_dialect_reads_back_the_same_numbers(
    rows: list[tuple[float, float, float]],
    step_ms: int,
    dialect: tuple[str, str],
    language: str,
    stamp: str,
    order: list[int],
    setting: tuple[bool, bool, str, str],
) -> None:
    delimiter, decimal = dialect
    quoted, preamble, newline, encoding = setting
    table = [list(HEADERS[language])]
    for k, values in enumerate(rows):
        cells = [STAMPS[stamp](k * step_ms), *(repr(v) for v in values)]
        table.append(
            [c.replace(".", decimal) if i or stamp in {"elapsed", "epoch_s"} else c for i, c in enumerate(cells)]
        )
    mark = '"' if quoted else ""
    lines = [delimiter.join(f"{mark}{row[i]}{mark}" for i in order) for row in table]
    text = newline.join([*(["Trend export", ""] if preamble else []), *lines, ""])
    record = read_csv(text.encode(encoding), zone="Europe/Berlin")
    np.testing.assert_array_equal(np.diff(record.time) > 0, True)
    np.testing.assert_allclose(record.time, np.arange(len(rows)) * step_ms / 1000, rtol=0, atol=1e-12)
    setpoint, command, speed = (np.array(column) for column in zip(*rows, strict=True))
    assert record.setpoint is not None
    np.testing.assert_array_equal(record.setpoint, setpoint)
    np.testing.assert_array_equal(record.command, command)
    np.testing.assert_array_equal(record.speed, speed)
    assert record.start == (None if stamp == "elapsed" else BEGIN)
    assert record.source is not None
    assert record.source.columns["speed"] == HEADERS[language][3]


@pytest.mark.parametrize("zone", ["Europe/Berlin", "America/New_York", "Australia/Lord_Howe"])
def test_a_clock_change_in_the_middle_keeps_the_steps_even(zone: str) -> None:
    # Local stamps over a whole year's two changes, written by zoneinfo, an independent reading of the tz tables.
    for month in (3, 4, 10, 11):
        begin = datetime(2026, month, 1, tzinfo=UTC)
        local = [(begin + timedelta(minutes=20 * k)).astimezone(ZoneInfo(zone)) for k in range(31 * 72)]
        rows = "\n".join(f"{t:%Y-%m-%d %H:%M:%S},{k},{k}" for k, t in enumerate(local))
        record = read_csv(f"time,command,speed\n{rows}".encode(), zone=zone)
        np.testing.assert_array_equal(record.time, np.arange(len(local)) * 1200.0)
        assert record.start == begin
