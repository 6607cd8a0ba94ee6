"""The rows of a log as columns, block by block; comments, footers and ragged lines set apart and counted."""

from __future__ import annotations

import io
import warnings
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from ident.errors import ReadError
from ident.findings import Finding
from ident.record.dialect import Dialect
from ident.record.encoding import Body
from ident.record.numbers import Cells, joined, read_cells
from ident.record.quote import counted
from ident.record.ragged import FEW, SHORT_SHARE, Combed, comb
from ident.record.segments import Flags, Lines
from ident.record.words import Words, read_words, spelled

LEAST_ROWS = 5
STAMP_BYTES = 40
CUT, RAGGED, NOTES = "incomplete last line", "another number of fields", "one filled field"

TimeCells = NDArray[Any] | pd.Series


@dataclass(frozen=True, slots=True)
class Wanted:
    """Positions of the columns to read, by what they hold.

    time      stamps (and the date beside them)
    iso       read the stamps as ISO 8601 on the way, twice as fast as afterwards
    """

    time: tuple[int, ...]
    numbers: tuple[int, ...]
    words: tuple[int, ...]
    iso: bool = False

    @property
    def all(self) -> list[int]:
        return sorted({*self.time, *self.numbers, *self.words})


@dataclass(frozen=True, slots=True, eq=False)
class Table:
    """Columns by position.

    time      stamps (datetime64), whole numbers, numbers, or bytes of at most STAMP_BYTES where they are written
    blank     {position of a time column: rows without a stamp}
    line      (n,) file line of each row, counted from 1; a quoted line break counts as none
    rows      lines that were meant as data, with those dropped
    dropped   {reason: count}
    """

    time: dict[int, TimeCells]
    blank: dict[int, Flags]
    numbers: dict[int, Cells]
    words: dict[int, Words]
    line: Lines
    rows: int
    dropped: dict[str, int]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True, eq=False)
class _Block:
    """One block read.

    notes    how many lines have one filled field;  note  the file line of the first of them
    """

    time: dict[int, TimeCells]
    blank: dict[int, Flags]
    numbers: dict[int, Cells]
    words: dict[int, Words]
    line: Lines
    notes: int
    note: int
    ragged: Lines
    fields: Lines
    unclosed: Lines
    cut: Lines
    lines: int


def read_table(body: Body, dialect: Dialect, wanted: Wanted) -> Table:
    """Parse the data rows.

    Raises ReadError: ragged-row, unreadable-table, too-few-rows, line-too-long.
    """
    blocks = list(_blocks(body, dialect, wanted))
    kinds = [{_kind(b.time[i]) for b in blocks if not b.blank[i].all()} for i in wanted.time]
    if any(len(k) > 1 and k != {"i", "f"} for k in kinds):
        # Some cells of a time column are of another kind: all as text, so that the first odd one can be named.
        blocks = list(_blocks(body, dialect, wanted, texts=True))
    line = np.concatenate([b.line for b in blocks])
    dropped, findings = _left_out(blocks, len(line), dialect)
    if len(line) < LEAST_ROWS:
        raise ReadError(
            "too-few-rows",
            f"The log has {counted(len(line))} of data; at least {LEAST_ROWS} are needed, and a useful test has "
            "hundreds.",
            {"rows": len(line)},
        )
    return Table(
        {i: _joined_time([b.time[i] for b in blocks if len(b.line)]) for i in wanted.time},
        {i: np.concatenate([b.blank[i] for b in blocks]) for i in wanted.time},
        {i: joined([b.numbers[i] for b in blocks]) for i in wanted.numbers},
        {i: spelled([b.words[i] for b in blocks]) for i in wanted.words},
        line,
        len(line) + dropped.get(RAGGED, 0),
        dropped,
        tuple(findings),
    )


def _blocks(body: Body, dialect: Dialect, wanted: Wanted, *, texts: bool = False) -> Iterator[_Block]:
    line = dialect.line
    blocks = iter(body.blocks(dialect.offset))
    block = next(blocks, b"")
    while block:
        after = next(blocks, b"")
        combed = comb(block, dialect.delimiter, dialect.width)
        # One letter is found much faster than a word, and clean rows have none; pandas takes "now" for a stamp.
        worded = b"o" in combed.text and (b"now" in combed.text or b"today" in combed.text)
        cells = _parsed(combed.text, dialect, wanted, iso=wanted.iso and not texts and not worded, texts=texts)
        yield _block(cells, dialect, wanted, combed, line, cut=not after and not body.complete)
        line += combed.lines
        block = after


def _block(
    cells: pd.DataFrame, dialect: Dialect, wanted: Wanted, combed: Combed, first_line: int, *, cut: bool
) -> _Block:
    line = np.arange(len(cells), dtype=np.int64) + first_line
    blank = {i: cells[i].isna().to_numpy(dtype=np.bool_) for i in wanted.all}
    # A comment or footer fills its first field and nothing else.
    empty = np.logical_and.reduce([flags for i, flags in blank.items() if i != 0])
    noted = empty & ~blank[0] if 0 in blank else np.zeros(len(cells), dtype=np.bool_)
    # Counted only: a log of nothing but such lines must not fill the memory.
    notes = len(combed.notes) + int(np.count_nonzero(noted))
    note = min((int(lines[0]) for lines in (combed.notes + first_line, line[noted]) if len(lines)), default=0)
    if empty.any():
        cells, line = cells[~empty], line[~empty]
        blank = {i: flags[~empty] for i, flags in blank.items()}
    last = (combed.ragged == combed.lines - 1) & (combed.fields < dialect.width) & cut
    return _Block(
        {i: _time(cells[i]) for i in wanted.time},
        {i: blank[i] for i in wanted.time},
        {i: read_cells(cells[i], dialect.decimal) for i in wanted.numbers},
        {i: read_words(cells[i]) for i in wanted.words},
        line,
        notes,
        note,
        combed.ragged[~last] + first_line,
        combed.fields[~last],
        combed.unclosed + first_line,
        combed.ragged[last] + first_line,
        combed.lines,
    )


def _parsed(text: bytes, dialect: Dialect, wanted: Wanted, *, iso: bool, texts: bool) -> pd.DataFrame:
    if not text.strip():
        # pandas refuses a table of blank lines.
        return pd.DataFrame({i: np.zeros(0) for i in wanted.all})
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error", pd.errors.ParserWarning)
            return pd.read_csv(
                io.BytesIO(text),
                sep=dialect.delimiter,
                decimal=dialect.decimal,
                header=None,
                names=list(range(dialect.width)),
                usecols=wanted.all,
                index_col=False,
                # Twice as fast as parsing the text afterwards.
                parse_dates=list(wanted.time) if iso else [],
                date_format="ISO8601",
                dtype=dict.fromkeys(wanted.time, "str") if texts else None,
                # Words are counted, not swallowed; blank lines are kept so that rows know their line.
                keep_default_na=False,
                na_values=[""],
                skip_blank_lines=False,
                # A quarter of the cost, where there is a blank at all.
                skipinitialspace=b" " in text,
                low_memory=False,
            )
    except (pd.errors.ParserError, pd.errors.ParserWarning) as cause:
        raise ReadError("unreadable-table", "The log cannot be read as a table: export it again as CSV.") from cause


def _time(column: pd.Series) -> TimeCells:
    if column.dtype.kind == "M":
        return column
    if column.dtype.kind in "iu":
        return column.to_numpy(dtype=np.int64)
    if column.dtype.kind == "f":
        return column.to_numpy(dtype=np.float64)
    cells = column.astype("str").fillna("").to_numpy(dtype=object)
    try:
        return cells.astype(f"S{STAMP_BYTES}")
    except UnicodeEncodeError:
        return np.array([str(c).encode("ascii", "replace") for c in cells]).astype(f"S{STAMP_BYTES}")


def _kind(cells: TimeCells) -> str:
    return str(cells.dtype) if cells.dtype.kind == "M" else cells.dtype.kind


def _joined_time(pieces: list[TimeCells]) -> TimeCells:
    if len(pieces) == 1:
        return pieces[0]
    if any(isinstance(p, pd.Series) for p in pieces):
        return pd.concat([p for p in pieces if isinstance(p, pd.Series)], ignore_index=True)
    return np.concatenate([p for p in pieces if isinstance(p, np.ndarray)])


def _left_out(blocks: list[_Block], rows: int, dialect: Dialect) -> tuple[dict[str, int], list[Finding]]:
    """What was no row, counted by reason.

    Raises ReadError: ragged-row, where the lines of another width are no exception.
    """
    ragged, fields, unclosed, cut = (
        np.concatenate([getattr(b, name) for b in blocks]) for name in ("ragged", "fields", "unclosed", "cut")
    )
    notes, note = sum(b.notes for b in blocks), min((b.note for b in blocks if b.notes), default=0)
    findings = []
    many = max(FEW, SHORT_SHARE * rows)
    if len(unclosed) > many:
        raise ReadError(
            "unclosed-quote",
            f"A quote opened in line {unclosed[0]} is not closed in it ({len(unclosed)} such lines): mend those lines.",
            {"line": int(unclosed[0]), "count": len(unclosed)},
        )
    if len(ragged) > many:
        raise ReadError(
            "ragged-row",
            f"Line {ragged[0]} has {fields[0]} fields where {dialect.width} are expected ({len(ragged)} such lines): "
            "is a decimal comma also the delimiter? Export with semicolons or decimal points.",
            {"line": int(ragged[0]), "fields": int(fields[0]), "expected": dialect.width, "count": len(ragged)},
        )
    if len(cut):
        findings.append(
            Finding(
                "truncated-tail",
                "warning",
                f"The last line ({cut[0]}) is incomplete and was dropped.",
                {"line": int(cut[0]), "rows_dropped": 1},
            )
        )
    if len(ragged) or len(unclosed):
        lines = np.sort(np.concatenate((ragged, unclosed)))
        findings.append(
            Finding(
                "ragged-rows",
                "warning",
                counted(len(lines), "line has", "lines have")
                + " another number of fields than the table, or a quote left open, and "
                + f"{'was' if len(lines) == 1 else 'were'} dropped; the first is line {lines[0]}.",
                {"count": len(lines), "first_line": int(lines[0])},
            )
        )
    if notes:
        findings.append(
            Finding(
                "dropped-lines",
                "warning",
                counted(notes, "line", "lines")
                + f" with one filled field (comments, a footer) {'was' if notes == 1 else 'were'} dropped, "
                f"the first is line {note}.",
                {"count": notes, "first_line": note},
            )
        )
    counts = {CUT: len(cut), RAGGED: len(ragged) + len(unclosed), NOTES: notes}
    return {reason: count for reason, count in counts.items() if count}, findings
