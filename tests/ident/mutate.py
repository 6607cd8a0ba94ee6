"""Damage to logs, for fuzzing: bytes changed, lines moved, columns cut, whole files spliced; all from a seed."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import numpy as np

ROWS = 40
BEGIN = datetime(2026, 3, 2, 8, 15, tzinfo=UTC)
NASTY = (
    b"\0", b'"', b",", b";", b"\t", b"\n", b"\r", b"\r\n", b"\xff", b"\xfe\xff", b"\xef\xbb\xbf", b"1e400", b"-",
    b"NaN", b"inf", b"=1+1", b"Bad", b"\x1b[31m", b"9" * 60, b"0000-00-00", b"9999-12-31", b"24:00:00", b"1,200",
    b"1.200,5", b" rpm", b"192", b"4294967295", b"MAN", b"now", b"T", b"Z", b"+99:99", b"time", b"speed",
    b"\xc3\xa4", b"",
)  # fmt: skip


def seeds() -> list[bytes]:
    """Clean logs of every layout and dialect that is read."""
    iso = [f"{BEGIN + timedelta(milliseconds=100 * k):%Y-%m-%dT%H:%M:%S.%f}Z" for k in range(ROWS)]
    german = [f"{BEGIN + timedelta(milliseconds=100 * k):%d.%m.%Y %H:%M:%S,%f}"[:-3] for k in range(ROWS)]
    american = [f"{BEGIN + timedelta(days=11, seconds=k):%m/%d/%y %I:%M:%S %p}" for k in range(ROWS)]
    wide = [f"{t},{900 + 300 * (k > 8)},{30 + k % 5},{900 + k}.5" for k, t in enumerate(iso)]
    long = [f"{tag},{t},{k},Good" for k, t in enumerate(iso) for tag in ("A.SP", "A.OP", "A.PV")]
    paired = [f"{t},900,{t},{30 + k % 3},{t},{900 + k}" for k, t in enumerate(iso)]
    local = [f"{t};900,5;30,{k};9{k:02d},1" for k, t in enumerate(german)]
    changes = [f"{t},{'' if k else 9},{k if k % 3 else ''},{k * 2 if k % 2 else ''}" for k, t in enumerate(iso)]
    logs = [
        ["Time,SP,CO,PV", *wide],
        ["Trend", "", "Zeit;Soll [1/min];Stellgröße [%];Ist", *local],
        ["Tag,Time,Value,Quality", *long],
        ["Time,SP,Time,OUT,Time,PV", *paired],
        ["t,u,y,MODE,Quality", *(f"{k / 10:.1f},{k % 3},{k},{'AUTO' if k % 9 else 'MAN'},192" for k in range(ROWS))],
        ["Time,SP,CO,PV", *changes],
        ["Date/Time,CO,PV", *(f'{t},"{k % 5} %","1,{k:03d}.5 rpm"' for k, t in enumerate(american))],
        ["stamp time,CO,PV", *(f"{1772439300 + k // 10},{k},{k * 3}" for k in range(ROWS))],
    ]  # fmt: skip
    texts = ["\n".join([*lines, ""]) for lines in logs]
    return [*(t.encode() for t in texts), texts[0].replace(",", "\t").encode("utf-16"), texts[1].encode("cp1252")]


def mutated(logs: list[bytes], rng: np.random.Generator) -> bytes:
    """One of the logs, damaged in one to five ways."""
    text = logs[rng.integers(len(logs))]
    for _ in range(int(rng.integers(1, 6))):
        kind = int(rng.integers(len(_DAMAGES) + 1))
        if kind < len(_DAMAGES):
            text = _DAMAGES[kind](text, rng)
        else:  # the head of this log, the tail of another
            other = logs[rng.integers(len(logs))]
            text = text[: int(rng.integers(len(text) + 1))] + other[int(rng.integers(len(other))) :]
    return text


def _put(text: bytes, rng: np.random.Generator) -> bytes:
    at, cut = int(rng.integers(len(text) + 1)), int(rng.integers(5))
    return text[:at] + NASTY[rng.integers(len(NASTY))] * int(rng.integers(1, 4)) + text[at + cut :]


def _flip(text: bytes, rng: np.random.Generator) -> bytes:
    if not text:
        return text
    at = int(rng.integers(len(text)))
    return text[:at] + bytes([int(rng.integers(256))]) + text[at + 1 :]


def _cut(text: bytes, rng: np.random.Generator) -> bytes:
    return text[: int(rng.integers(len(text) + 1))] + b"\0" * int(rng.integers(3))


def _lines(text: bytes, rng: np.random.Generator) -> bytes:
    """Lines taken out, repeated or moved."""
    lines = text.split(b"\n")
    a, b = sorted(int(k) for k in rng.integers(len(lines) + 1, size=2))
    block, rest = lines[a:b], lines[:a] + lines[b:]
    at = int(rng.integers(len(rest) + 1))
    return b"\n".join([rest, lines[:b] + block + lines[b:], rest[:at] + block + rest[at:]][rng.integers(3)])


def _everywhere(text: bytes, rng: np.random.Generator) -> bytes:
    """One string for another all through: delimiters, signs, words."""
    old, new = (NASTY[k] for k in rng.integers(len(NASTY), size=2))
    return text.replace(old, new) if old and len(text) < 20_000 else text


_DAMAGES = (_put, _put, _flip, _cut, _lines, _everywhere)
