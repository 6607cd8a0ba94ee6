"""From cells to numbers: plain ones as they stand, others by one rule for the whole column."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from ident.errors import ReadError
from ident.record.quote import printable, quoted
from ident.record.segments import Flags, Floats, Lines

_EXPONENT = r"(?:[eE][+-]?[0-9]+)?"
_UNIT = re.compile(r"[ \t]*(?:rpm|1/min|U/min|tr/min|rad/s|rps|rev/s|Hz|%|mA|mV|V|A|s|ms)$")
_INFINITE = re.compile(r"[+-]?(?:inf(?:inity)?|∞|1\.#INF)", re.IGNORECASE)
_HAS_DIGITS = re.compile(r"[+-]?[.,]?[0-9]")
_WORDS_KEPT = 5
# More cells than this share that hold digits and yet are no numbers: the log was not understood.
_NOT_UNDERSTOOD = 0.02


@dataclass(frozen=True, slots=True)
class Numbers:
    """One column as numbers.

    values    (n,), NaN where missing
    words     {word: count} of what stood in place of numbers, the commonest few
    unread    rows with a word
    blank     rows with an empty cell
    """

    values: Floats
    words: dict[str, int]
    unread: int
    blank: int


def to_numbers(cells: pd.Series, *, name: str, decimal: str, line: Lines) -> Numbers:
    """Read a column; infinite numbers are refused, words become missing.

    line    (n,) file line of each row

    Raises ReadError: not-finite, no-numbers, ambiguous-numbers, unreadable-number.
    """
    words: Counter[str] = Counter()
    if cells.dtype.kind in "iuf":
        values = cells.to_numpy(dtype=np.float64)
        blank = int(np.isnan(values).sum())
    else:
        values, words, blank = _from_text(cells, name=name, decimal=decimal, line=line)
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
    return Numbers(values, dict(words.most_common(_WORDS_KEPT)), words.total(), blank)


def _from_text(cells: pd.Series, *, name: str, decimal: str, line: Lines) -> tuple[Floats, Counter[str], int]:
    text = cells.where(cells.notna(), "").astype("str").str.strip()
    array = text.to_numpy(dtype=object)
    blank = array == ""
    values = np.full(len(array), np.nan)
    plain = text.str.fullmatch(
        rf"[+-]?(?:[0-9]+{re.escape(decimal)}?[0-9]*|{re.escape(decimal)}[0-9]+){_EXPONENT}"
    ).to_numpy(dtype=np.bool_)
    rest = np.flatnonzero(~plain & ~blank)
    if any(_HAS_DIGITS.match(array[i]) and "#" not in array[i] for i in rest):
        return _by_one_rule(array, blank, name=name, decimal=decimal, line=line)
    values[plain] = text[plain].str.replace(decimal, ".", regex=False).to_numpy(dtype=object).astype(np.float64)
    infinite = [i for i in rest if _INFINITE.fullmatch(array[i])]
    values[infinite] = np.inf
    words = Counter(printable(array[i]) for i in rest)
    return values, words, int(blank.sum())


def _by_one_rule(
    array: NDArray[np.object_], blank: Flags, *, name: str, decimal: str, line: Lines
) -> tuple[Floats, Counter[str], int]:
    """The slow way: units stripped, decimal and thousands signs decided by the whole column."""
    stripped = [_UNIT.sub("", cell) for cell in array]
    point, comma = _grouping(stripped, decimal, name, line)
    grouped = rf"[0-9]{{1,3}}(?:{re.escape(comma)}[0-9]{{3}})+"
    pattern = re.compile(rf"[+-]?(?:{grouped}|[0-9]*)(?:{re.escape(point)}[0-9]*)?{_EXPONENT}")
    values = np.full(len(array), np.nan)
    words: Counter[str] = Counter()
    odd: list[int] = []
    for i in np.flatnonzero(~blank).tolist():
        cell = stripped[i]
        if _INFINITE.fullmatch(cell):
            values[i] = np.inf
        elif pattern.fullmatch(cell) and _HAS_DIGITS.match(cell):
            values[i] = float(cell.replace(comma, "").replace(point, "."))
        else:
            words[printable(array[i])] += 1
            if _HAS_DIGITS.match(cell) and "#" not in cell:
                odd.append(i)
    if len(odd) > _NOT_UNDERSTOOD * len(array):
        raise ReadError(
            "unreadable-number",
            f"Line {line[odd[0]]}, column {quoted(name)}: {quoted(array[odd[0]])} is not a plain "
            "number; export numbers without units or thousands signs.",
            {"line": int(line[odd[0]]), "column": printable(name), "count": len(odd)},
        )
    return values, words, int(blank.sum())


def _grouping(cells: list[str], decimal: str, name: str, line: Lines) -> tuple[str, str]:
    """The decimal sign and the thousands sign of a column: decided by all its cells, never by one."""
    single = {sign: [i for i, c in enumerate(cells) if c.count(sign) == 1] for sign in ".,"}

    # A sign is surely decimal where it does not part groups of three, or follows the other sign.
    def decimal_for_sure(sign: str, other: str) -> bool:
        grouped = re.compile(rf"[+-]?[0-9]{{1,3}}{re.escape(sign)}[0-9]{{3}}")
        return any(
            not grouped.fullmatch(cells[i])
            and re.fullmatch(rf"[+-]?[0-9{other}]*{re.escape(sign)}[0-9]*{_EXPONENT}", cells[i])
            for i in single[sign]
        )

    point, comma = decimal_for_sure(".", ","), decimal_for_sure(",", ".")
    if point and comma:
        return (".", ",") if decimal == "." else (",", ".")
    if point or comma:
        return (".", ",") if point else (",", ".")
    other = "," if decimal == "." else "."
    if any(c.count(other) for c in cells if re.fullmatch(r"[+-]?[0-9.,]+", c)):
        row = next(i for i, c in enumerate(cells) if other in c)
        raise ReadError(
            "ambiguous-numbers",
            f"Line {line[row]}, column {quoted(name)}: {quoted(cells[row])} may have a decimal or "
            "a thousands sign, and no other cell decides; export without thousands signs.",
            {"line": int(line[row]), "column": printable(name)},
        )
    return decimal, other
