"""From cells to numbers: plain ones as they stand, others (units, thousands signs) by one rule for the whole column."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from ident.errors import ReadError
from ident.record.grouping import LONGEST, Bytes, Chars, as_bytes, as_chars, grouped_numbers
from ident.record.quote import printable, quoted
from ident.record.segments import Flags, Floats, Lines

Rows = NDArray[np.int64]

_INFINITE = re.compile(r"[+-]?(?:inf(?:inity)?|∞|1\.#INF)", re.IGNORECASE)
# By character code: whether a plain number may hold it (0 ends a cell).
_PLAIN = {d: np.isin(np.arange(256), [0, *f"0123456789+-eE{d}".encode()]) for d in ".,"}
_WORDS_KEPT = 5
# Different words counted in a column: a log of nothing else must not fill the memory.
MOST_WORDS = 1000
OTHERS = "other words"
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
    odd_texts: Bytes
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
        return Cells(column.to_numpy(dtype=np.float64), blank, none, np.zeros(0, dtype="S1"), none, Counter())
    texts = column.astype("str").fillna("").to_numpy(dtype=object)
    cells = as_bytes(texts)
    chars = as_chars(cells)
    plain = _PLAIN[decimal][chars].all(axis=1) & (chars[:, 0] != 0) & ((chars[:, -1] == 0) | (chars.shape[1] < LONGEST))
    values = np.full(len(texts), np.nan)
    values[plain] = _plain_values(chars[plain], decimal)
    rest = np.flatnonzero(np.isnan(values) & ~blank)
    left = texts[rest]
    odd = _with_digits(cells[rest])
    # Each different word is looked at once.
    codes, spelled = pd.factorize(left[~odd])
    stripped = [str(t).strip() for t in spelled]
    empty = np.array([t == "" for t in stripped], dtype=np.bool_)[codes]
    infinite = np.array([bool(_INFINITE.fullmatch(t)) for t in stripped], dtype=np.bool_)[codes]
    values[rest[~odd][infinite]] = np.inf
    blank[rest[~odd][empty]] = True
    word = ~empty & ~infinite
    counts: Counter[str] = Counter()
    which, many = np.unique(codes[word], return_counts=True)
    kept = np.argsort(-many, kind="stable")[:MOST_WORDS]
    for code, count in zip(which[kept].tolist(), many[kept].tolist(), strict=True):
        counts[printable(stripped[code])] += count
    if len(kept) < len(many):
        counts[OTHERS] += int(many.sum() - many[kept].sum())
    return Cells(values, blank, rest[odd], cells[rest[odd]], rest[~odd][word], counts)


def _plain_values(chars: Chars, decimal: str) -> Floats:
    """Cells that hold the characters of plain numbers only; NaN where they make none."""
    if decimal == ",":
        chars = np.where(chars == ord(","), np.uint8(ord(".")), chars)
    cells = np.ascontiguousarray(chars).view(f"S{chars.shape[1]}").reshape(-1)
    try:
        return cells.astype(np.float64)
    except ValueError:
        return np.array(pd.to_numeric(cells.astype("U").astype(object), errors="coerce"), dtype=np.float64)


def _with_digits(cells: Bytes) -> Flags:
    """Cells that begin like a number; those with # are a spreadsheet's words."""
    view = np.ascontiguousarray(cells).view(np.uint8).reshape(len(cells), cells.dtype.itemsize)
    digit = (view[:, :3] >= 48) & (view[:, :3] <= 57)
    sign = (view[:, 0] == ord("+")) | (view[:, 0] == ord("-"))
    mark = [(view[:, k] == ord(".")) | (view[:, k] == ord(",")) for k in (0, 1)]
    begins = digit[:, 0] | ((sign | mark[0]) & digit[:, 1]) | (sign & mark[1] & digit[:, 2])
    flags: Flags = begins & (np.strings.find(cells, b"#") < 0)
    return flags


def joined(pieces: list[Cells]) -> Cells:
    """Stretches of one column, one after the other."""
    if len(pieces) == 1:
        return pieces[0]
    starts = np.cumsum([0, *(len(p.values) for p in pieces[:-1])])
    counts: Counter[str] = Counter()
    for p in pieces:
        counts.update(p.counts)
        if len(counts) > 2 * MOST_WORDS:
            rest = counts.total()
            counts = Counter(dict(counts.most_common(MOST_WORDS)))
            counts[OTHERS] += rest - counts.total()
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
    if rows.all():
        return cells
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
                f"Line {row}, column {quoted(name)}: {quoted(cells.odd_texts[lost[0]].decode())} is not a plain "
                "number; export numbers without units or thousands signs.",
                {"line": row, "column": printable(name), "count": len(lost)},
            )
        words.update(printable(t.decode()) for t in cells.odd_texts[lost])
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
