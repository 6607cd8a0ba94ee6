"""Files that mean harm, or look like it: each ends in a clear error or a finding, in bounded time and memory.

The bound on processor time is relative to a clean log of 10 MB, read in the same process.
"""

from __future__ import annotations

import time
import tracemalloc
from collections.abc import Callable
from functools import cache

import pytest

import ident
from ident import IdentError, LoopRecord, read_csv

SIZE = 10_000_000  # bytes
TIMES = 20.0  # the clean log's processor time
MEMORY = 256 * 2**20  # bytes held at once: some for each byte of a block of 8 MB, however large the file

HEAD = b"time,command,speed\n"
ROW = b"%d.5,%d.25,100.125\n"


def rows(count: int) -> bytes:
    return b"".join(ROW % (k, k % 7) for k in range(count))


CLEAN = HEAD + rows(SIZE // 21)
WIDE = b",".join(b"c%d" % k for k in range(100_000)) + b"\n"

HOSTILE = {
    "one line of 10 MB": (HEAD + b"1" * SIZE, {"line-too-long"}),
    "one line of 10 MB in the middle": (HEAD + rows(100) + b"7," * (SIZE // 2) + b"\n" + rows(100), {"line-too-long"}),
    "one quoted cell of 30 MB": (HEAD + rows(20) + b'1,2,"' + b"x\n" * (3 * SIZE // 2),
                                 {"read: date-unknown, dropped-lines, ragged-rows, speed-frozen"}),
    "a quote in every line": (HEAD + b'1.5,2,"3\n' * (SIZE // 9), {"unclosed-quote", "no-numbers"}),
    "100,000 columns": (WIDE + (b"1," * 99_999 + b"1\n") * 40, {"too-many-columns"}),
    "100,000 columns in one row only": (HEAD + rows(100) + WIDE * 12, {"ragged-row"}),
    "NULs": (b"\0" * SIZE, {"empty-log"}),
    "NULs among rows": (HEAD + (rows(10) + b"\0" * 1000) * (SIZE // 1200), {"not-text"}),
    "newlines": (b"\n" * SIZE, {"empty-log"}),
    "delimiters": (b"," * (2**19) + b"\n" + b",,\n" * (SIZE // 4), {"too-few-rows"}),
    "another word in every cell": (HEAD + b"".join(b"%d.5,w%d,v%d\n" % (k, k, k) for k in range(SIZE // 24)),
                                   {"no-numbers"}),
    "another preamble without end": (b"".join(b"note %d, see there\n" % k for k in range(SIZE // 20)), {"no-numbers"}),
    "digits without end": (HEAD + rows(20) + (b"1" * 1000 + b",2,3\n") * (SIZE // 1005),
                           {"not-finite", "unreadable-time", "unreadable-number"}),
}  # fmt: skip


@cache
def clean() -> float:
    """Processor time, s, of a clean log."""
    return min(spent(lambda: read_csv(CLEAN)) for _ in range(2))


def spent(task: Callable[[], object]) -> float:
    begin = time.process_time()
    task()
    return time.process_time() - begin


def codes(record: LoopRecord) -> set[str]:
    assert record.source is not None
    return {f.code for f in record.source.findings}


def code_of(source: bytes) -> str:
    try:
        record = read_csv(source)
    except IdentError as error:
        return error.code if error.message.isprintable() and len(error.message) < 600 else error.message
    return f"read: {', '.join(sorted(codes(record)))}"


@pytest.mark.parametrize("name", HOSTILE)
def test_it_is_refused_soon_and_in_little_memory(name: str) -> None:
    source, codes = HOSTILE[name]
    found: list[str] = []
    assert spent(lambda: found.append(code_of(source))) < TIMES * clean()
    assert found[0] in codes
    tracemalloc.start()
    try:
        code_of(source)
        assert tracemalloc.get_traced_memory()[1] < MEMORY
    finally:
        tracemalloc.stop()


FORMULA = b'=HYPERLINK("http://example.org","x")'


def test_formula_cells_are_words_like_others() -> None:
    body = rows(100).split(b"\n")
    body[40] = b"40.5,@SUM(1+1),100.125"
    body[41] = b"41.5,2.25,=1+2"
    record = read_csv(HEAD + b"\n".join(body))
    assert "missing-values" in codes(record)
    assert [(e.start, e.stop) for e in record.excluded] == [(40, 42)]
    assert record.source is not None
    words = [w for f in record.source.findings for w in f.evidence if w.startswith("word: ")]
    assert sorted(words) == ["word: =1+2", "word: @SUM(1+1)"]


def test_a_formula_as_a_header_is_a_header() -> None:
    with pytest.raises(IdentError) as caught:
        read_csv(b'time,command,"' + FORMULA.replace(b'"', b'""') + b'"\n' + rows(20))
    assert caught.value.code == "missing-column"


def test_a_header_of_control_characters_is_not_echoed() -> None:
    with pytest.raises(IdentError) as caught:
        read_csv(b"time,\x1b[31mcommand\x1b[0m\x07,\x1b]0;x\x07\n" + rows(200))
    assert caught.value.message.isprintable()
    named = {"command": 1, "speed": 2}
    record = read_csv(b"time,\x1b[31mred\x07,\x1b]0;x\x07\n" + rows(200), columns=named)
    assert record.source is not None
    assert all(header.isprintable() for header in record.source.columns.values())


def test_headers_that_stand_twice_are_asked_for() -> None:
    body = b"".join(b"%d.5,%d.25,100.125,100.25\n" % (k, k % 7) for k in range(20))
    with pytest.raises(IdentError) as caught:
        read_csv(b"time,command,speed,speed\n" + body)
    assert caught.value.code == "ambiguous-columns"
    assert read_csv(b"time,command,speed,speed\n" + body, columns={"speed": 3}).speed[0] == 100.25


@pytest.mark.parametrize("year", [b"0000", b"0001", b"1899", b"9999"])
def test_years_beyond_reason_are_refused(year: bytes) -> None:
    body = b"".join(b"%b-01-01T00:00:%02dZ,%d,1.5\n" % (year, k, k % 7) for k in range(20))
    assert code_of(HEAD + body) == "unreadable-time"


def test_numbers_beyond_a_double_are_refused_and_tiny_ones_are_zero() -> None:
    assert code_of(HEAD + rows(20) + b"20.5,1e400,1\n") == "not-finite"
    assert code_of(HEAD + rows(20) + b"20.5,1," + b"9" * 400 + b"\n") == "not-finite"
    assert read_csv(HEAD + rows(20) + b"20.5,1,1e-400\n").speed[-1] == 0.0
    assert ident.read_csv(HEAD + rows(20) + b"20.5,1," + b"0" * 400 + b"1\n").speed[-1] == 1.0
