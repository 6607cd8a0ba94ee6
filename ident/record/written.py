"""Stamps as people and programs write them, to ticks: ISO 8601, day-first, month-first, month names, 12-hour clocks.

Cells of one shape (all digits alike) are read together, column by column of characters; a log has few shapes.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray

from ident.errors import ReadError
from ident.record.quote import printable, quoted
from ident.record.segments import Flags, Lines

Bytes = NDArray[np.bytes_]
Ints = NDArray[np.int64]

DATE_ORDERS = ("dmy", "mdy", "ymd")
MOST_SHAPES = 200
NS = 1_000_000_000
CENTURY, PIVOT = 2000, 70  # 26 is 2026, 70 is 1970

_MONTHS = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
_DATES = (
    r"(?P<year>\d{4})(?P<mark>[-/.])(?P<month>\d{1,2})[-/.](?P<day>\d{1,2})",
    r"(?P<year>\d{4})(?P<month>\d\d)(?P<day>\d\d)(?=T)",
    r"(?P<a>\d{1,2})(?P<mark>[-/.])(?P<b>\d{1,2})[-/.](?P<c>\d{4}|\d{2})",
    r"(?P<day>\d{1,2})[-/. ](?P<name>[A-Za-z]{3,9})[-/., ]+(?P<c>\d{4}|\d{2})",
    r"(?P<name>[A-Za-z]{3,9}) (?P<day>\d{1,2}),? (?P<c>\d{4})",
)
_CLOCKS = (
    r"(?P<hour>\d{1,2}):(?P<minute>\d{2})(?::(?P<second>\d{2})(?:[.,:](?P<part>\d{1,9}))?)?"
    r"(?: ?(?P<half>[APap])\.?[Mm]\.?)?",
    r"(?P<hour>\d{2})(?P<minute>\d{2})(?P<second>\d{2})(?:[.,](?P<part>\d{1,9}))?",
)
_ZONE = r"(?: ?(?P<zone>Z|UTC|GMT|(?P<sign>[+-])(?P<zh>\d{2}):?(?P<zm>\d{2})?))?"
_PATTERNS = (
    *(re.compile(f"{date}(?:[T ,_]+{clock}{_ZONE})?") for date, clock in product(_DATES, _CLOCKS)),
    re.compile(_CLOCKS[0]),
)


@dataclass(frozen=True, slots=True, eq=False)
class Written:
    """Stamps as read.

    ticks       (n,), of `per_second` since 1970, or since midnight where there is no date
    kind        absolute (with offset), local (without), clock (no date)
    two_digits  years are written with two digits
    """

    ticks: Ints
    per_second: int
    kind: str
    two_digits: bool


def read_written(cells: Bytes, line: Lines, *, name: str, date_order: str | None) -> Written:
    """Read stamps.

    cells    (n,), none blank
    line     (n,) file lines

    Raises ReadError: unreadable-time, ambiguous-dates.
    """
    cells = np.strings.strip(cells)
    fields, seen = _fields(cells, line, name)
    if "a" in seen:
        _settle_order(fields, cells, line, name, date_order)
    dated = fields["year"] >= 0
    short = fields["two"] > 0
    if dated.any() and not dated.all():
        raise unreadable(cells, ~dated if dated[0] else dated, line, name)
    year = np.where(short, fields["year"] + np.where(fields["year"] < PIVOT, CENTURY, CENTURY - 100), fields["year"])
    hour = np.maximum(fields["hour"], 0)
    half = fields["half"]
    sound = np.where(half >= 0, (hour >= 1) & (hour <= 12), hour < 24)
    hour = np.where(half >= 0, hour % 12 + 12 * half, hour)
    days = np.zeros(len(cells), dtype=np.int64)
    if dated.all():
        months = (year - 1970) * 12 + fields["month"] - 1
        first = months.astype("M8[M]").astype("M8[D]").astype(np.int64)
        length = (months + 1).astype("M8[M]").astype("M8[D]").astype(np.int64) - first
        days = first + fields["day"] - 1
        sound &= (fields["month"] >= 1) & (fields["month"] <= 12) & (fields["day"] >= 1) & (fields["day"] <= length)
        sound &= year >= 1
    minute, second = np.maximum(fields["minute"], 0), np.maximum(fields["second"], 0)
    sound &= (minute < 60) & (second <= 60)
    if not sound.all():
        raise unreadable(cells, ~sound, line, name)
    zoned = fields["zoned"] > 0
    if zoned.any() and not zoned.all():
        row = int(np.argmax(zoned != zoned[0]))
        raise ReadError(
            "unreadable-time",
            f"Line {line[row]}, column {quoted(name)}: {quoted(cells[row].decode())} and the first row differ in "
            "having an offset; export all stamps with one.",
            {"line": int(line[row])},
        )
    part = fields["part"]  # ns
    fine = bool((part % 1000).any())
    seconds = ((days * 24 + hour) * 60 + minute - fields["offset"]) * 60 + second
    if fine and np.abs(seconds).max() > 9e9:
        raise unreadable(cells, np.abs(seconds) > 9e9, line, name)
    ticks = seconds * NS + part if fine else seconds * (NS // 1000) + part // 1000
    kind = "clock" if not dated.any() else "absolute" if zoned.all() else "local"
    return Written(ticks, NS if fine else NS // 1000, kind, bool(short.any()))


def _fields(cells: Bytes, line: Lines, name: str) -> tuple[dict[str, Ints], set[str]]:
    """Each field of the stamps as numbers, -1 (0 for sums) where a stamp has none."""
    n = len(cells)
    width = int(np.strings.str_len(cells).max(initial=1))
    view = np.ascontiguousarray(cells.astype(f"S{width}")).view(np.uint8).reshape(n, width)
    digits = (view >= 48) & (view <= 57)
    shapes = np.where(digits, np.uint8(48), view)
    fields = {key: np.full(n, -1) for key in ("year", "month", "day", "hour", "minute", "second", "half", "a", "b")}
    fields |= {key: np.zeros(n, dtype=np.int64) for key in ("part", "offset", "zoned", "two", "dotted")}
    left = np.arange(n)
    seen: set[str] = set()
    for _ in range(MOST_SHAPES):
        alike = (shapes[left] == shapes[left[0]]).all(axis=1)
        rows, left = left[alike], left[~alike]
        text = cells[rows[0]].decode("ascii", "replace")
        match = next((m for p in _PATTERNS if (m := p.fullmatch(text))), None)
        if match is None:
            raise unreadable(cells, np.isin(np.arange(n), rows), line, name)
        seen |= {key for key, value in match.groupdict().items() if value is not None}
        _take(fields, match, view[rows] - np.uint8(48), rows)
        if len(left) == 0:
            return fields, seen
    raise unreadable(cells, np.isin(np.arange(n), left), line, name)


def _take(fields: dict[str, Ints], match: re.Match[str], digits: NDArray[np.uint8], rows: Ints) -> None:
    def number(key: str) -> Ints:
        start, stop = match.span(key)
        value = np.zeros(len(rows), dtype=np.int64)
        for k in range(start, stop):
            value = value * 10 + digits[:, k]
        return value

    found = match.groupdict()
    for key in ("year", "month", "day", "hour", "minute", "second", "a", "b"):
        if found.get(key) is not None:
            fields[key][rows] = number(key)
    if found.get("c") is not None:
        fields["year"][rows] = number("c")
        fields["two"][rows] = len(found["c"]) == 2
        fields["dotted"][rows] = found.get("mark") == "."
    if (month := found.get("name")) is not None:
        key = month[:3].casefold()
        fields["month"][rows] = _MONTHS.index(key) + 1 if key in _MONTHS else 0
    if found.get("part") is not None:
        fields["part"][rows] = number("part") * 10 ** (9 - len(found["part"]))
    if (half := found.get("half")) is not None:
        fields["half"][rows] = half in "pP"
    if found.get("zone") is not None:
        fields["zoned"][rows] = 1
        if found["sign"]:
            minutes = number("zh") * 60 + (number("zm") if found["zm"] else 0)
            fields["offset"][rows] = -minutes if found["sign"] == "-" else minutes


def _settle_order(fields: dict[str, Ints], cells: Bytes, line: Lines, name: str, date_order: str | None) -> None:
    """Which of the first two numbers of a date is the day; asked for where no row tells."""
    here = fields["a"] >= 0
    a, b = fields["a"][here], fields["b"][here]
    order = date_order or ("dmy" if (fields["dotted"][here] > 0).all() else None)
    if order is None:
        dmy, mdy = bool((b <= 12).all()), bool((a <= 12).all())
        if dmy and mdy and (a != b).any():
            row = int(np.flatnonzero(here)[np.argmax(a != b)])
            month = [m.capitalize() for m in _MONTHS]
            i, k, text = int(fields["a"][row]), int(fields["b"][row]), quoted(cells[row].decode("ascii", "replace"))
            raise ReadError(
                "ambiguous-dates",
                f"Line {line[row]}, column {quoted(name)}: {text} may be {i} {month[max(k, 1) - 1]} or "
                f'{k} {month[max(i, 1) - 1]}, and no row decides; give the option "date_order" as dmy (day first) or '
                "mdy (month first).",
                {"line": int(line[row])},
            )
        order = "dmy" if dmy else "mdy"
    if order == "ymd":
        # 26-03-02: what was taken for the year is the day.
        if not (fields["two"][here] > 0).all():
            raise unreadable(cells, here, line, name)
        fields["day"][here], fields["month"][here], fields["year"][here] = fields["year"][here], b, a
    else:
        fields["day"][here], fields["month"][here] = (a, b) if order == "dmy" else (b, a)


def unreadable(cells: Bytes, bad: Flags, line: Lines, name: str) -> ReadError:
    """The error that names the first stamp that cannot be read."""
    row = int(np.argmax(bad))
    return ReadError(
        "unreadable-time",
        f"Line {line[row]}, column {quoted(name)}: {quoted(cells[row].decode('ascii', 'replace'))} is no time stamp "
        "that is read here; export ISO 8601 (2026-03-02T08:15:00.100Z), epoch or elapsed seconds.",
        {"line": int(line[row]), "column": printable(name), "count": int(bad.sum())},
    )
