"""Numbers with units and thousands signs in the cells: one decimal sign for the whole column, decided by all its cells.

Whole columns at a time, as fixed-width bytes: a log of a million such cells must not cost a million calls.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.errors import ReadError
from ident.record.quote import printable, quoted
from ident.record.segments import Flags, Floats, Lines

Bytes = NDArray[np.bytes_]

LONGEST = 40  # bytes of a cell that may still be a number
_UNIT = re.compile(
    rb"[ \t]*(rpm|1/min|U/min|tr/min|min-1|rad/s|rps|rev/s|m/min|m/s|Hz|%|mA|mV|V|A|Nm|s|ms|us)$", re.IGNORECASE
)
_SHAPE = re.compile(rb"[+-]?(?:\d+[.,]?\d*|[.,]\d+)(?:[.,]\d+)*(?:[eE][+-]?\d+)?")
_MOST_UNITS = 20


class OtherDecimal(Exception):
    """The log's decimal sign is the other one: its plain cells have to be read again with it."""


@dataclass(frozen=True, slots=True, eq=False)
class Grouped:
    """values    (n,), NaN where a cell is no number after all;  units    {unit: cells}"""

    values: Floats
    units: dict[str, int]


def grouped_numbers(texts: NDArray[np.object_], plain: Floats, decimal: str, *, name: str, line: Lines) -> Grouped:
    """Read cells with digits that are not plain numbers.

    texts    (n,), stripped
    plain    values of the column's plain cells, read with `decimal` (NaN elsewhere)
    line     (n,) file lines

    Raises ReadError: ambiguous-numbers; OtherDecimal where plain cells were read with the wrong sign.
    """
    cells = np.array([t.encode("ascii", "replace") for t in texts]).astype(f"S{LONGEST}")
    cells, units = _without_units(cells)
    point, comma = _signs(cells, plain, decimal, name, line)
    sound = _grouped_well(cells, point, comma)
    bare = np.strings.replace(np.strings.replace(cells, comma, b""), point, b".")
    # Whole columns go through numpy's own parser; where it stumbles, the culprits are found by their shape.
    values = np.full(len(cells), np.nan)
    try:
        values[sound] = bare[sound].astype(np.float64)
    except ValueError:
        sound &= np.array([bool(_SHAPE.fullmatch(c)) and c.count(b".") < 2 for c in bare.tolist()], dtype=np.bool_)
        values[sound] = bare[sound].astype(np.float64)
    return Grouped(values, units)


def _without_units(cells: Bytes) -> tuple[Bytes, dict[str, int]]:
    """Known units taken off the ends, and how often each stood there."""
    units: dict[str, int] = {}
    left = np.ones(len(cells), dtype=np.bool_)
    for _ in range(_MOST_UNITS):
        ends = np.flatnonzero(left)
        found = next((m for i in ends[:1000] if (m := _UNIT.search(cells[i]))), None)
        if found is None:
            break
        hit = np.strings.endswith(cells, found[1]) & left
        trimmed = np.strings.rstrip(np.strings.slice(cells[hit], 0, np.strings.str_len(cells[hit]) - len(found[1])))
        # "rpm" ends in "m": a unit stands behind a digit, a sign or a blank.
        last = trimmed.view(np.uint8).reshape(len(trimmed), -1)[np.arange(len(trimmed)), _last(trimmed)]
        whole = ((last >= 48) & (last <= 57)) | (last == 46)
        rows = np.flatnonzero(hit)[whole]
        cells = cells.copy()
        cells[rows] = trimmed[whole]
        left[np.flatnonzero(hit)] = False
        if len(rows):
            units[found[1].decode()] = units.get(found[1].decode(), 0) + len(rows)
    return cells, units


def _last(cells: Bytes) -> NDArray[np.intp]:
    return np.maximum(np.strings.str_len(cells) - 1, 0).astype(np.intp)


def _signs(cells: Bytes, plain: Floats, decimal: str, name: str, line: Lines) -> tuple[bytes, bytes]:
    """The decimal sign and the thousands sign: decided by all cells of the column, never by one."""
    fractions = bool(np.any(plain[np.isfinite(plain)] % 1))
    sure = {
        sign: bool(_decimal_for_sure(cells, sign, other).any()) or (fractions and sign.decode() == decimal)
        for sign, other in ((b".", b","), (b",", b"."))
    }
    mine, other = (b".", b",") if decimal == "." else (b",", b".")
    if sure[mine]:
        return mine, other
    if sure[other]:
        if np.isfinite(plain).any():
            raise OtherDecimal
        return other, mine
    twice = np.strings.count(cells, other) > 1
    single = np.flatnonzero((np.strings.count(cells, other) == 1) & ~twice)
    if len(single) and not twice.any():
        row = int(single[0])
        raise ReadError(
            "ambiguous-numbers",
            f"Line {line[row]}, column {quoted(name)}: {quoted(cells[row].decode())} may have a decimal or "
            "a thousands sign, and no other cell decides; export without thousands signs.",
            {"line": int(line[row]), "column": printable(name)},
        )
    return mine, other


def _decimal_for_sure(cells: Bytes, sign: bytes, other: bytes) -> Flags:
    """A single sign that does not part groups of three, or that follows the other sign."""
    at = np.strings.find(cells, sign)
    length = np.strings.str_len(cells)
    signed = np.strings.startswith(cells, b"-") | np.strings.startswith(cells, b"+")
    before, after = at - signed, length - at - 1
    follows = np.strings.find(cells, other)
    flags: Flags = (np.strings.count(cells, sign) == 1) & (
        ((follows < 0) & ((after != 3) | (before > 3) | (before < 1))) | ((follows >= 0) & (follows < at))
    )
    return flags


def _grouped_well(cells: Bytes, point: bytes, comma: bytes) -> Flags:
    """Thousands signs stand every three digits before the decimal sign, and nowhere else."""
    length = np.strings.str_len(cells)
    view = np.ascontiguousarray(cells).view(np.uint8).reshape(len(cells), -1)
    at = np.strings.find(cells, point)
    end = np.where(at >= 0, at, length)
    signed = (np.strings.startswith(cells, b"-") | np.strings.startswith(cells, b"+")).astype(np.int64)
    count = np.strings.count(cells, comma)
    sound: Flags = (np.strings.count(cells, point) <= 1) & (length > 0) & (length < LONGEST)
    rows = np.arange(len(cells))
    for k in range(1, int(count.max(initial=0)) + 1):
        place = end - 4 * k
        here = count >= k
        sound &= ~here | ((place > signed) & (view[rows, np.clip(place, 0, LONGEST - 1)] == comma[0]))
    sound &= (count == 0) | (end - 4 * count - signed <= 3)
    return sound
