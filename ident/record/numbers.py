"""From cells to numbers: plain ones as they stand, others (units, thousands signs) by one rule for the whole column."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from ident.errors import ReadError
from ident.record.grouping import grouped_numbers
from ident.record.quote import printable, quoted
from ident.record.segments import Flags, Floats, Lines

Rows = NDArray[np.int64]
Texts = NDArray[np.object_]

_INFINITE = re.compile(r"[+-]?(?:inf(?:inity)?|∞|1\.#INF)", re.IGNORECASE)
_HAS_DIGITS = re.compile(r"[+-]?[.,]?[0-9]")
_WORDS_KEPT = 5
# More cells than this share that hold digits and yet are no numbers: the log was not understood.
_NOT_UNDERSTOOD = 0.02


@dataclass(frozen=True, slots=True, eq=False)
class Cells:
    """A stretch of a column, read as far as one cell tells.

    values    (n,), NaN where missing or not plain
    blank     (n,), empty cells
    odd       rows of cells with digits that are not plain numbers, and their texts
    words     rows of other texts, and their count by text
    """

    values: Floats
    blank: Flags
    odd: Rows
    odd_texts: Texts
    words: Rows
    counts: Counter[str]


@dataclass(frozen=True, slots=True, eq=False)
class Numbers:
    """One column as numbers.

    values    (n,), NaN where missing
    blank     (n,), empty cells
    words     {word: count} of what stood in place of numbers, the commonest few
    unread    rows with a word
    units     {unit: count} of units that stood in the cells
    """

    values: Floats
    blank: Flags
    words: dict[str, int]
    unread: int
    units: dict[str, int]


def read_cells(column: pd.Series, decimal: str) -> Cells:
    """Read plain numbers, and set the other cells apart."""
    none = np.zeros(0, dtype=np.int64)
    blank = np.array(column.isna(), dtype=np.bool_)
    if column.dtype.kind in "iuf":
        return Cells(column.to_numpy(dtype=np.float64), blank, none, none.astype(object), none, Counter())
    texts = column.astype("str")
    other = texts.str.contains("." if decimal == "," else ",", regex=False).fillna(False).to_numpy(dtype=np.bool_)
    plain = texts.str.replace(",", ".", regex=False) if decimal == "," else texts
    # numpy's copy, because pandas hands out its own and that may be read-only
    values = np.array(pd.to_numeric(plain.to_numpy(dtype=object), errors="coerce"), dtype=np.float64)
    values[other] = np.nan
    rest = np.flatnonzero(np.isnan(values) & ~blank)
    left = texts.to_numpy(dtype=object)[rest]
    stripped = np.array([str(t).strip() for t in left], dtype=object)
    empty = stripped == ""
    blank[rest[empty]] = True
    infinite = np.array([bool(_INFINITE.fullmatch(t)) for t in stripped], dtype=np.bool_)
    values[rest[infinite]] = np.inf
    odd = np.array([bool(_HAS_DIGITS.match(t)) and "#" not in t for t in stripped], dtype=np.bool_) & ~infinite
    words = ~odd & ~empty & ~infinite
    counts = Counter(printable(t) for t in stripped[words])
    return Cells(values, blank, rest[odd], stripped[odd], rest[words], counts)


def joined(pieces: list[Cells]) -> Cells:
    """Stretches of one column, one after the other."""
    starts = np.cumsum([0, *(len(p.values) for p in pieces[:-1])])
    counts: Counter[str] = Counter()
    for p in pieces:
        counts.update(p.counts)
    return Cells(
        np.concatenate([p.values for p in pieces]),
        np.concatenate([p.blank for p in pieces]),
        np.concatenate([p.odd + at for p, at in zip(pieces, starts, strict=True)]),
        np.concatenate([p.odd_texts for p in pieces]),
        np.concatenate([p.words + at for p, at in zip(pieces, starts, strict=True)]),
        counts,
    )


def chosen(cells: Cells, rows: Flags) -> Cells:
    """The given rows of a column.

    rows    (n,) flags
    """
    place = np.cumsum(rows) - 1
    odd, words = rows[cells.odd], rows[cells.words]
    return Cells(
        cells.values[rows],
        cells.blank[rows],
        place[cells.odd[odd]],
        cells.odd_texts[odd],
        place[cells.words[words]],
        cells.counts,
    )


def to_numbers(cells: Cells, *, name: str, decimal: str, line: Lines) -> Numbers:
    """Settle a whole column; infinite numbers are refused, words become missing.

    line    (n,) file line of each row

    Raises ReadError: not-finite, no-numbers, ambiguous-numbers, unreadable-number.
    """
    values, words, units = cells.values, Counter(cells.counts), dict[str, int]()
    if len(cells.odd):
        values = values.copy()
        read = grouped_numbers(cells.odd_texts, values, decimal, name=name, line=line[cells.odd])
        values[cells.odd] = read.values
        units = read.units
        lost = np.flatnonzero(np.isnan(read.values))
        if len(lost) > max(1, _NOT_UNDERSTOOD * len(values)):
            row = int(line[cells.odd[lost[0]]])
            raise ReadError(
                "unreadable-number",
                f"Line {row}, column {quoted(name)}: {quoted(cells.odd_texts[lost[0]])} is not a plain "
                "number; export numbers without units or thousands signs.",
                {"line": row, "column": printable(name), "count": len(lost)},
            )
        words.update(printable(t) for t in cells.odd_texts[lost])
    bad = np.isinf(values)
    if bad.any():
        at = int(line[np.argmax(bad)])
        raise ReadError(
            "not-finite",
            f"Line {at}, column {quoted(name)}: the number is infinite or too large; replace it by "
            "a number or leave the cell empty.",
            {"line": at, "column": printable(name), "count": int(bad.sum())},
        )
    if not np.isfinite(values).any():
        shown = f"; it holds {quoted(next(iter(words)))}" if words else ""
        raise ReadError(
            "no-numbers",
            f"Column {quoted(name)} has no numbers{shown}: check which column it is, and the decimal sign.",
            {"column": printable(name)},
        )
    return Numbers(values, cells.blank, dict(words.most_common(_WORDS_KEPT)), words.total(), units)
