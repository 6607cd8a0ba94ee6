"""Round trip through layouts: the same samples written wide, long, paired or on change read back the same.

With what plants add on the way: quality, footers, rows that came late, thousands signs, units in cells.
"""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from mutate import mutated, seeds

from ident import IdentError, LoopRecord, read_csv

BEGIN = datetime(2026, 3, 14, 8, 15, 0, 250000, tzinfo=UTC)
level = st.integers(-90_000, 90_000).map(lambda k: k / 8)  # exact in few digits
samples = st.lists(st.tuples(level, level, level), min_size=6, max_size=40)


def stamps(count: int, step_ms: int) -> list[str]:
    return [f"{BEGIN + timedelta(milliseconds=k * step_ms):%Y-%m-%dT%H:%M:%S.%f}Z" for k in range(count)]


def same(record: LoopRecord, rows: list[tuple[float, float, float]], step_ms: int) -> None:
    np.testing.assert_allclose(record.time, np.arange(len(rows)) * step_ms / 1000, rtol=0, atol=1e-9)
    setpoint, command, speed = (np.array(c) for c in zip(*rows, strict=True))
    np.testing.assert_array_equal(record.setpoint, setpoint)
    np.testing.assert_array_equal(record.command, command)
    np.testing.assert_array_equal(record.speed, speed)
    assert record.start == BEGIN


@settings(max_examples=60, deadline=None)
@given(rows=samples, step_ms=st.integers(1, 5000), by_tag=st.booleans(), quality=st.booleans(), footer=st.booleans())
def test_long(rows: list[tuple[float, float, float]], step_ms: int, by_tag: bool, quality: bool, footer: bool) -> None:
    reports = [
        (tag, t, v) for t, row in zip(stamps(len(rows), step_ms), rows, strict=True)
        for tag, v in zip(("A1.SP", "A1.OUT", "A1.PV"), row, strict=True)
    ]  # fmt: skip
    if by_tag:
        reports.sort(key=lambda r: r[0])
    lines = [f"{tag},{t},{v!r}" + ",Good" * quality for tag, t, v in reports]
    head = "Tag,Timestamp,Value" + ",Quality" * quality
    same(read_csv("\n".join([head, *lines, *["*** end ***"] * footer]).encode()), rows, step_ms)


@settings(max_examples=60, deadline=None)
@given(rows=samples, step_ms=st.integers(1, 5000), spare=st.integers(0, 4), decimal=st.sampled_from(".,"))
def test_paired_of_unlike_length(
    rows: list[tuple[float, float, float]], step_ms: int, spare: int, decimal: str
) -> None:
    at = stamps(len(rows), step_ms)
    # Setpoint and command are reported where they change, so their columns end earlier.
    columns = [
        [(at[k], row[i]) for k, row in enumerate(rows) if i == 2 or k == 0 or row[i] != rows[k - 1][i]]
        for i in range(3)
    ]
    lines = [
        ";".join(f"{c[k][0]};{c[k][1]!r}".replace(".", decimal) if k < len(c) else ";" for c in columns)
        for k in range(len(rows))
    ]
    lines = [";".join(cell.replace(",", ".") if "T" in cell else cell for cell in line.split(";")) for line in lines]
    text = "\n".join(["Time;A.SP;Time;A.OUT;Time;A.PV", *lines, *["; ; ; ; ;"] * spare, ""])
    same(read_csv(text.encode()), rows, step_ms)


@settings(max_examples=60, deadline=None)
@given(rows=samples, step_ms=st.integers(1, 5000))
def test_on_change(rows: list[tuple[float, float, float]], step_ms: int) -> None:
    kept = [k for k in range(len(rows)) if k == 0 or rows[k][1:] != rows[k - 1][1:]]
    if len(kept) < 5:
        return
    lines = []
    for k, t in enumerate(stamps(len(rows), step_ms)):
        cells = [repr(v) if k == 0 or v != rows[k - 1][i] else "" for i, v in enumerate(rows[k])]
        if any(cells):
            lines.append(",".join([t, *cells]))
    record = read_csv("\n".join(["Time,SP,CO,PV", *lines, ""]).encode(), blanks="held")
    setpoint, command, speed = (np.array(c) for c in zip(*rows, strict=True))
    if record.rows != len(kept):  # nothing was blank: the rows stand as they are
        kept = list(range(len(rows)))
    np.testing.assert_allclose(record.time, np.array(kept) * step_ms / 1000, rtol=0, atol=1e-9)
    np.testing.assert_array_equal(record.command, command[kept])
    np.testing.assert_array_equal(record.speed, speed[kept])
    np.testing.assert_array_equal(record.setpoint, setpoint[kept])


@settings(max_examples=60, deadline=None)
@given(
    rows=samples,
    step_ms=st.integers(1, 5000),
    swaps=st.lists(st.integers(1, 37), max_size=2),
    repeats=st.lists(st.integers(0, 39), max_size=2),
    cells=st.sampled_from(["{:,.4f}", "{:,.4f} rpm", "{!r}", "{!r} %"]),
)
def test_wide_with_rows_late_and_repeated_units_and_thousands(
    rows: list[tuple[float, float, float]], step_ms: int, swaps: list[int], repeats: list[int], cells: str
) -> None:
    lines = [
        ",".join([t, *(f'"{cells.format(v)}"' for v in row)])
        for t, row in zip(stamps(len(rows), step_ms), rows, strict=True)
    ]
    for k in sorted({2 * s for s in swaps}):
        if k + 2 < len(lines):
            lines[k], lines[k + 1] = lines[k + 1], lines[k]
    for k in sorted({r for r in repeats if r < len(lines)}, reverse=True):
        lines.insert(k, lines[k])
    same(read_csv("\n".join(["Time,SP,CO,PV", *lines, ""]).encode()), rows, step_ms)


def test_damaged_logs_of_every_layout_are_read_or_refused_with_a_code() -> None:
    # The long run is tests/benchmarks/fuzz_read_csv.py.
    logs = seeds()
    for k in range(400):
        try:
            record = read_csv(mutated(logs, np.random.default_rng([6, k])))
        except IdentError as error:
            messages = {error.code: error.message}
        else:
            assert record.source is not None
            messages = {f.code: f.message for f in record.source.findings}
        assert all(code and message.isprintable() and len(message) < 700 for code, message in messages.items())
