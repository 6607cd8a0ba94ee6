"""What read_csv refuses: each with its code, the line or column, and what to do; never a raw control character."""

from __future__ import annotations

import io
import pickle
import struct
import zlib
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ident import IdentError, ReadError, read_csv

HEAD = "time,command,speed"
ROWS = [f"{k * 0.1:.1f},{k % 3},{100 + k}" for k in range(10)]


def log(*rows: str, head: str = HEAD) -> bytes:
    return "\n".join((head, *rows)).encode()


def changed(row: int, text: str) -> bytes:
    return log(*ROWS[:row], text, *ROWS[row + 1 :])


def refusal(source: bytes, **options: object) -> ReadError:
    with pytest.raises(ReadError) as caught:
        read_csv(source, **options)  # type: ignore[arg-type]
    message = caught.value.message
    assert message.isprintable(), message
    assert len(message) < 600
    return caught.value


PNG = (
    b"\x89PNG\r\n\x1a\n" + struct.pack(">I", 13) + b"IHDR" + struct.pack(">IIBBBBB", 8, 8, 8, 2, 0, 0, 0)
    + b"\0" * 4 + zlib.compress(bytes(range(200)))
)  # fmt: skip


@pytest.mark.parametrize(
    ("source", "code", "said"),
    [
        (b"", "empty-log", "empty"),
        (b" \n\r\n\t", "empty-log", "empty"),
        (b"\0\0\0", "empty-log", "empty"),
        (b"\xef\xbb\xbf", "empty-log", "empty"),
        (PNG, "not-text", "export the log as CSV"),
        (b"\xff\xd8\xff\xe0\x10JFIF" + bytes(range(256)) * 4, "not-text", "not a text file"),
        (b"PK\x03\x04" + b"\x14\0\x06\0" * 20, "not-text", "not a text file"),
        ("a,b\n1,2\n".encode("utf-16-le"), "not-text", "byte order mark"),
        (b"speed\n" + b"\n".join(b"%d.5" % k for k in range(20)), "one-column", "side by side"),
        (b"hello world", "one-column", "side by side"),
        (log(*ROWS[:3]), "too-few-rows", "3 rows"),
        (log(), "too-few-rows", "no rows of numbers"),
        (b"a,b,c\nx,y,z\nu,v,w\n" * 5, "no-numbers", "one row per sample"),
        (changed(4, "0.4,1,inf"), "not-finite", 'Line 6, column "speed"'),
        (changed(4, "0.4,-Infinity,104"), "not-finite", 'Line 6, column "command"'),
        (changed(4, "0.4,1,1e400"), "not-finite", 'Line 6, column "speed"'),
        (changed(4, "inf,1,104"), "not-finite", 'Line 6, column "time"'),
        (changed(4, "0.4,1,1.#INF"), "not-finite", 'Line 6, column "speed"'),
        (changed(4, "oops,1,104"), "unreadable-time", 'Line 6, column "time": "oops"'),
        (log(*ROWS, *[f",1,{k}" for k in range(4)]), "unreadable-time", "Line 12"),
        (log(*[f"{k / 10},1,{k}\n{k / 10},1,{k + 1}" for k in range(40)], *[f"{k}.5,1,{k}" for k in range(4, 400)]),
         "conflicting-rows", "Line 3 repeats the stamp"),
        (log(*[f"{k // 20 * 10 + k % 20}.5,1,{k}" for k in range(1200)]), "time-not-increasing", "s before its turn"),
        (log(*ROWS, *["9,9,1,104"] * 5), "ragged-row", "Line 12 has 4 fields where 3"),
        (log(*ROWS, *['0.4,1,"104'] * 4), "unclosed-quote", "line 12"),
        (log(*[f"{k // 10 if k < 50 else 5 + (k - 50) // 7},1,{k}" for k in range(90)]), "shared-stamps",
         "full resolution"),
        (log(*ROWS, head="time,command,counts"), "counts-per-rev-missing", '"counts_per_rev"'),
        (b"time,command,speed\n" + b"1" * (2**20 + 10) + b"\n", "line-too-long", "one sample per line"),
        (log(*ROWS, head="time,a,b"), "missing-column", '"time", "a", "b"'),
        (log(*ROWS, head="a,command,speed"), "missing-column", "No column for time"),
        (log(*ROWS, head="time,CV,speed"), "ambiguous-columns", '"CV"'),
        (log(*ROWS, head="time,command,CV"), "ambiguous-columns", '"CV"'),
        (log(*ROWS, head="time,OP,MV"), "ambiguous-columns", '"OP", "MV"'),
        (log(*ROWS, head="speed,command,speed"), "ambiguous-columns", "2 columns may be the speed"),
        (log(*[f"{k}.5,x,{k}" for k in range(9)]), "no-numbers", 'Column "command" has no numbers; it holds "x"'),
        (log(*[f"{5e12 + k:.0f},1,{k}" for k in range(9)]), "unreadable-time", "neither elapsed seconds nor"),
        (log(*[f"3/{k + 1}/2026 10:00,1,{k}" for k in range(9)]), "ambiguous-dates", 'option "date_order"'),
        (log(*[f"31/31/2026 10:0{k},1,{k}" for k in range(9)]), "unreadable-time", "Line 2"),
        (log(*[f"3/{k + 1}/2026 10:00{'+01:00' * (k == 4)},1,{k}" for k in range(9)]), "ambiguous-dates", "Line 2"),
        (log(*[f"2026-03-02 08:1{'-' * (k == 4)}5:0{k},1,{k}" for k in range(9)]), "unreadable-time", "Line 6"),
        (log(*[f"{'now' if k == 4 else f'2026-03-02 08:1{k}'},1,{k}" for k in range(9)]), "unreadable-time", "Line 6"),
        (log(*[f"0000-01-01T00:00:0{k}Z,1,{k}" for k in range(9)]), "unreadable-time", "Line 2"),
        (log(*[f"9999-12-31T00:00:0{k}Z,1,{k}" for k in range(9)]), "unreadable-time", "Line 2"),
        (log(*[f"2026-02-30T00:00:0{k}Z,1,{k}" for k in range(9)]), "unreadable-time", "Line 2"),
        (
            log(*[f"2026-03-02T00:00:0{k}{'Z' * (k != 4)},1,{k}" for k in range(9)]),
            "unreadable-time",
            "Line 6",
        ),
        (log(*[f'{k}.5,1,"1,{k}00"' for k in range(9)]), "ambiguous-numbers", 'Line 2, column "speed": "1,000"'),
        (log(*[f"{k}.5,1,{k}#{k}7.." for k in range(9)]), "no-numbers", "speed"),
        (b",".join(b"c%d" % k for k in range(2000)) + b"\n" + (b"1," * 1999 + b"1\n") * 9, "too-many-columns", "2000"),
    ],
)  # fmt: skip
def test_bad_logs_get_their_own_error(source: bytes, code: str, said: str) -> None:
    error = refusal(source)
    assert error.code == code
    assert said in error.message


@pytest.mark.parametrize(
    ("options", "code", "said"),
    [
        ({"counts_per_rev": 0.0}, "bad-option", "counts of one revolution"),
        ({"blanks": "zero"}, "bad-option", "held, missing"),
        ({"zone": "Atlantis/Centre"}, "bad-option", "Europe/Berlin"),
        ({"zone": "../../etc/passwd"}, "bad-option", "Europe/Berlin"),
        ({"date_order": "ydm"}, "bad-option", "dmy, mdy, ymd"),
        ({"start": "yesterday"}, "bad-option", "ISO 8601"),
        ({"start": "2026-03-02T08:15:00"}, "bad-option", "offset"),
        ({"columns": {"speed": "tacho"}}, "missing-column", '"time", "command", "speed"'),
        ({"columns": {"speed": 3}}, "missing-column", "for speed"),
        ({"columns": {"speed": -1}}, "missing-column", "for speed"),
        ({"columns": {"speed": 1, "command": 1}}, "ambiguous-columns", "same column"),
        ({"columns": {"velocity": 2}}, "unknown-role", "time, setpoint, command, speed"),
    ],
)
def test_bad_options_say_what_would_do(options: dict[str, object], code: str, said: str) -> None:
    error = refusal(log(*ROWS), **options)
    assert error.code == code
    assert said in error.message


def test_line_numbers_count_every_line_of_the_file() -> None:
    text = log("s,%,rpm", *ROWS[:3], "", "", *ROWS[3:6], "0.6,1,1e999", *ROWS[7:])
    assert refusal(b"Trend export\r\n\r\n" + text.replace(b"\n", b"\r\n")).evidence["line"] == 13


def test_a_file_that_is_not_there_is_a_read_error(tmp_path: Path) -> None:
    with pytest.raises(ReadError) as caught:
        read_csv(tmp_path / "none.csv")
    assert caught.value.code == "no-file"
    with pytest.raises(TypeError, match="binary"):
        read_csv(io.StringIO("time"))  # type: ignore[arg-type]


def test_control_characters_are_not_echoed() -> None:
    error = refusal(log(*ROWS, head='"ti\x1b[31mme",<b>,x'))
    assert error.code == "missing-column"
    assert "?[31m" in error.message


def test_errors_survive_pickling() -> None:
    error = refusal(changed(4, "0.4,1,inf"))
    again = pickle.loads(pickle.dumps(error))
    assert (again.code, again.message, again.evidence) == (error.code, error.message, error.evidence)


def said(text: bytes) -> list[str]:
    """What the reader has to say about a file: its findings or its refusal. Anything else it raises is a fault."""
    try:
        record = read_csv(text)
    except IdentError as error:
        return [error.code, error.message]
    assert record.source is not None
    return [f.message for f in record.source.findings]


CLEAN = log(*ROWS)


@settings(max_examples=150, deadline=None)
@given(st.lists(st.tuples(st.integers(0, len(CLEAN)), st.binary(max_size=3), st.integers(0, 4)), max_size=4))
def test_damaged_files_are_read_or_refused_with_a_code(damage: list[tuple[int, bytes, int]]) -> None:
    text = CLEAN
    for at, put, cut in damage:
        text = text[:at] + put + text[at + cut :]
    assert all(message.isprintable() for message in said(text))


@settings(max_examples=150, deadline=None)
@given(st.text(alphabet='01295.,;\t\n\r"-+eE:/ TZAMPtimespdcoan#%[]()\x00', max_size=200))
def test_any_text_is_read_or_refused_with_a_code(text: str) -> None:
    assert all(message.isprintable() for message in said(text.encode()))
