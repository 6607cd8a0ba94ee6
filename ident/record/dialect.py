"""How a log is written: its delimiter, decimal sign, header, units row and the first line of data."""

from __future__ import annotations

import csv
import re
from collections import Counter
from dataclasses import dataclass
from itertools import pairwise

from ident.errors import ReadError

DELIMITERS = (";", "\t", ",")
MOST_COLUMNS = 1000
_SAMPLE = 65536
_LONG_SAMPLE = 2**20
_SAMPLE_LINES = 120
# A row of data may hold words ("No Data") in all but the time column.
_LEAST_SHARE = 0.25

_NUMBER = re.compile(r"[+-]?(?=[.,]?\d)[\d.,]*(?:[eE][+-]?\d+)?")
_STAMP = re.compile(r"\d[\d\-/.:, T]*(?: ?[AaPp]\.?[Mm]\.?| ?Z| ?[+-]\d\d:?\d\d)?")
_INFINITE = re.compile(r"[+-]?inf(?:inity)?", re.IGNORECASE)
_COMMA = re.compile(r"[+-]?(?:\d+|\d{1,3}(?:\.\d{3})+),\d+(?:[eE][+-]?\d+)?")
_POINT = re.compile(r"[+-]?\d*\.\d+(?:[eE][+-]?\d+)?")


@dataclass(frozen=True, slots=True)
class Dialect:
    """The writing of one log.

    decimal     "." or ","
    width       fields per data row
    header      texts of the rows directly above the data that may hold column names, nearest last
    first       cells of the first data row
    offset      of the first data row in the bytes
    line        of the first data row in the file, counted from 1
    """

    delimiter: str
    decimal: str
    width: int
    header: tuple[tuple[str, ...], ...]
    first: tuple[str, ...]
    offset: int
    line: int


def sniff(text: bytes) -> Dialect:
    """Find the dialect in the first rows.

    text    UTF-8

    Raises ReadError: one-column, no-numbers, too-few-rows, too-many-columns.
    """
    newline, lines = _sample(text)
    candidates = [_candidate(lines, d) for d in DELIMITERS]
    score, delimiter, rows, width, first = max(candidates, key=lambda c: c[0])
    if score == 0:
        _refuse(rows_by_delimiter=[c[2] for c in candidates])
    if width > MOST_COLUMNS:
        raise ReadError(
            "too-many-columns",
            f"The log has {width} columns, more than {MOST_COLUMNS}: export only time, setpoint, command and speed.",
            {"columns": width},
        )
    header: list[tuple[str, ...]] = []
    for row in reversed(rows[:first]):
        cells = tuple(cell.strip() for cell in row)
        if not any(cells) and not header:
            continue  # a blank line between header and data
        if not any(cells) or len(_trimmed(cells)) > width:
            break
        header.insert(0, (*cells, *[""] * width)[:width])
    offset = sum(len(line) + len(newline) for line in lines[:first])
    decimal = _decimal(rows[first:], width) if delimiter != "," else "."
    return Dialect(delimiter, decimal, width, tuple(header[-4:]), tuple(rows[first]), offset, first + 1)


def _sample(text: bytes) -> tuple[bytes, list[bytes]]:
    newline = b"\n" if b"\n" in text[:_LONG_SAMPLE] else b"\r"
    for size in (_SAMPLE, _LONG_SAMPLE):
        lines = text[:size].split(newline)
        if len(lines) > 20 or len(text) <= size:
            break
    if len(text) > size:
        lines.pop()  # cut by the sample, not by the writer
    return newline, lines[:_SAMPLE_LINES]


def _cells(line: bytes, delimiter: str) -> list[str]:
    text = line.decode(errors="replace").strip("\r")
    try:
        return next(csv.reader([text], delimiter=delimiter, skipinitialspace=True), [])
    except csv.Error:
        return text.split(delimiter)


def _candidate(lines: list[bytes], delimiter: str) -> tuple[float, str, list[list[str]], int, int]:
    """Score, delimiter, rows, width and first data row: how much of the sample this delimiter explains."""
    rows = [_cells(line, delimiter) for line in lines]
    shares = [_share(row) for row in rows]
    widths = Counter(len(row) for row, share in zip(rows, shares, strict=True) if share >= _LEAST_SHARE)
    if not widths:
        return 0.0, delimiter, rows, 0, 0
    width = max(widths, key=lambda w: (widths[w], w))
    data = [i for i, row in enumerate(rows) if shares[i] >= _LEAST_SHARE and len(row) == width]
    score = sum(shares[i] for i in data)
    # A preamble may hold one row that looks like data ("Period, from, to"); data come in pairs.
    pairs = (i for i, after in pairwise(data) if after == i + 1)
    first = next(pairs, data[0])
    return score, delimiter, rows, width, first


def _share(row: list[str]) -> float:
    """The share of values among the cells that are not blank; 0 for a row of fewer than two fields."""
    filled = [cell.strip() for cell in row if cell.strip()]
    if len(row) < 2 or not filled:
        return 0.0
    return sum(bool(_is_value(cell)) for cell in filled) / len(filled)


def _is_value(cell: str) -> bool:
    return any(pattern.fullmatch(cell) for pattern in (_NUMBER, _STAMP, _INFINITE))


def _decimal(rows: list[list[str]], width: int) -> str:
    cells = [cell.strip() for row in rows if len(row) == width for cell in row]
    commas = sum(bool(_COMMA.fullmatch(cell)) for cell in cells)
    points = sum(bool(_POINT.fullmatch(cell)) for cell in cells)
    return "," if commas > points else "."


def _trimmed(cells: tuple[str, ...]) -> tuple[str, ...]:
    end = max((i + 1 for i, cell in enumerate(cells) if cell), default=0)
    return cells[:end]


def _refuse(rows_by_delimiter: list[list[list[str]]]) -> None:
    widest = max((len(row) for rows in rows_by_delimiter for row in rows), default=0)
    if widest < 2:
        raise ReadError(
            "one-column",
            "The log has only one column: export time, command and speed side by side, separated by comma, "
            "semicolon or tab.",
        )
    filled = max(sum(len(row) == widest for row in rows) for rows in rows_by_delimiter)
    if filled <= 1:
        raise ReadError("too-few-rows", "The log has a header but no rows of numbers below it.", {"rows": 0})
    raise ReadError(
        "no-numbers",
        "No rows of numbers were found: export the log as a table with one row per sample and one column per signal.",
    )
