"""Numbers with units and thousands signs in the cells: one decimal sign for the whole column, decided by all its cells.

Whole columns at a time, character by character: a log of a million such cells must not cost a million calls.
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
Chars = NDArray[np.uint8]
Ints = NDArray[np.int64]

LONGEST = 40  # bytes of a cell that may still be a number
_UNIT = re.compile(
    rb"[ \t]*(rpm|1/min|U/min|tr/min|min-1|rad/s|rps|rev/s|m/min|m/s|Hz|%|mA|mV|V|A|Nm|s|ms|us)$", re.IGNORECASE
)
_EXPONENT = re.compile(rb"[+-]?(?:\d+\.?\d*|\.\d+)[eE][+-]?\d+")
_MOST_UNITS = 20
_LOOKED_AT = 1000  # cells, for a unit not seen yet
_EXACT = 2**53
_COMMA, _POINT = ord(","), ord(".")


class OtherDecimal(Exception):
    """The log's decimal sign is the other one: its plain cells have to be read again with it."""


@dataclass(frozen=True, slots=True, eq=False)
class Grouped:
    """values    (n,), NaN where a cell is no number after all;  units    {unit: cells}"""

    values: Floats
    units: dict[str, int]


def grouped_numbers(cells: Bytes, plain: Floats, decimal: str, *, name: str, line: Lines) -> Grouped:
    """Read cells with digits that are not plain numbers.

    cells    (n,), as of `as_bytes`
    plain    values of the column's plain cells, read with `decimal` (NaN elsewhere)
    line     (n,) file lines

    Raises ReadError: ambiguous-numbers; OtherDecimal where plain cells were read with the wrong sign.
    """
    chars, length, units = _without_units(as_chars(cells))
    point = _decimal_sign(chars, length, plain, decimal, cells, name, line)
    return Grouped(_values(chars, length, point), units)


def as_bytes(texts: NDArray[np.object_]) -> Bytes:
    """Cells of at most LONGEST bytes, without blanks around; what is no ASCII becomes ?."""
    try:
        cells = texts.astype(f"S{LONGEST}")
    except UnicodeEncodeError:
        cells = np.array([str(t).encode("ascii", "replace") for t in texts]).astype(f"S{LONGEST}")
    return np.strings.strip(cells)


def as_chars(cells: Bytes) -> Chars:
    """The characters of cells, (n, of the longest), 0 beyond the end of each."""
    chars = np.ascontiguousarray(cells).view(np.uint8).reshape(len(cells), cells.dtype.itemsize)
    return chars[:, : int(np.strings.str_len(cells).max(initial=1))]


def _without_units(chars: Chars) -> tuple[Chars, Ints, dict[str, int]]:
    """Known units taken off the ends: characters, lengths, and how often each unit stood there."""
    chars = chars.copy()
    length = np.count_nonzero(chars, axis=1).astype(np.int64)
    units: dict[str, int] = {}
    left = _is_digit(chars[np.arange(len(chars)), np.maximum(length - 1, 0)]) ^ True
    for _ in range(_MOST_UNITS):
        rows = np.flatnonzero(left)
        found = next((m for i in rows[:_LOOKED_AT] if (m := _UNIT.search(bytes(chars[i, : length[i]])))), None)
        if found is None:
            break
        tail = np.frombuffer(found[1], dtype=np.uint8)
        start = length[rows] - len(tail)
        hit = start > 0
        for k, char in enumerate(tail):
            hit &= chars[rows, np.maximum(start + k, 0)] == char
        rows, start = rows[hit], start[hit]
        left[rows] = False
        while len(rows) and (blank := chars[rows, np.maximum(start - 1, 0)] == ord(" ")).any():
            start -= blank
        before = chars[rows, np.maximum(start - 1, 0)]
        # "rpm" ends in "m": a unit stands behind a number.
        whole = _is_digit(before) | (before == _POINT)
        rows, start = rows[whole], start[whole]
        chars[rows] *= np.arange(chars.shape[1]) < start[:, None]
        length[rows] = start
        if len(rows):
            units[found[1].decode()] = units.get(found[1].decode(), 0) + len(rows)
    return chars, length, units


def _is_digit(chars: Chars) -> Flags:
    flags: Flags = (chars >= 48) & (chars <= 57)
    return flags


def _decimal_sign(chars: Chars, length: Ints, plain: Floats, decimal: str, cells: Bytes, name: str, line: Lines) -> int:
    """The decimal sign, the other one parting thousands: decided by all cells of the column, never by one."""
    fractions = bool(np.any(plain[np.isfinite(plain)] % 1))
    mine, other = (_POINT, _COMMA) if decimal == "." else (_COMMA, _POINT)
    counts = {sign: np.count_nonzero(chars == sign, axis=1) for sign in (mine, other)}
    if fractions or _decimal_for_sure(chars, length, counts, mine, other):
        return mine
    if _decimal_for_sure(chars, length, counts, other, mine):
        if np.isfinite(plain).any():
            raise OtherDecimal
        return other
    if (counts[other] == 1).any() and not (counts[other] > 1).any():
        row = int(np.argmax(counts[other] == 1))
        raise ReadError(
            "ambiguous-numbers",
            f"Line {line[row]}, column {quoted(name)}: {quoted(cells[row].decode())} may have a decimal or "
            "a thousands sign, and no other cell decides; export without thousands signs.",
            {"line": int(line[row]), "column": printable(name)},
        )
    return mine


def _decimal_for_sure(chars: Chars, length: Ints, counts: dict[int, NDArray[np.intp]], sign: int, other: int) -> bool:
    """Whether some cell has this sign once, where it does not part groups of three, or behind the other sign."""
    single = counts[sign] == 1
    at = np.argmax(chars == sign, axis=1)
    before, after = at - ((chars[:, 0] == ord("-")) | (chars[:, 0] == ord("+"))), length - at - 1
    alone = counts[other] == 0
    behind = ~alone & (np.argmax(chars == other, axis=1) < at)
    return bool((single & ((alone & ((after != 3) | (before > 3) | (before < 1))) | behind)).any())


def _values(chars: Chars, length: Ints, point: int) -> Floats:
    """Numbers with thousands signs every three digits before the decimal sign, and nowhere else; else NaN."""
    n, width = chars.shape
    whole, parted, since = (np.zeros(n, dtype=np.int64) for _ in range(3))
    places = np.zeros(n, dtype=np.int64)
    seen = np.zeros(n, dtype=np.bool_)
    sound = (length > 0) & (length < LONGEST)
    comma = _COMMA + _POINT - point
    for k in range(width):
        char = chars[:, k]
        digit, end = _is_digit(char), char == 0
        is_comma, is_point = char == comma, char == point
        sign = (char == ord("-")) | (char == ord("+")) if k == 0 else np.zeros(n, dtype=np.bool_)
        sound &= digit | end | is_comma | is_point | sign
        sound &= ~is_comma | (~seen & np.where(parted > 0, since == 3, (since >= 1) & (since <= 3)))
        sound &= ~is_point | (~seen & ((parted == 0) | (since == 3)))
        whole = np.where(digit & (whole < _EXACT), whole * 10 + (char - np.uint8(48)), whole)
        places += digit & seen
        since = np.where(is_comma, 0, since + (digit & ~seen))
        parted += is_comma
        seen |= is_point
    sound &= seen | (parted == 0) | (since == 3)
    sound &= places + since + parted > 0
    # Two exact integers divided are rounded as the written number is.
    exact = sound & (whole < _EXACT) & (places <= 22)
    values = np.full(n, np.nan)
    values[exact] = whole[exact] / 10.0 ** places[exact]
    values[exact & (chars[:, 0] == ord("-"))] *= -1
    for row in np.flatnonzero(~exact & (length > 0) & (length < LONGEST)).tolist():
        bare = bytes(chars[row, : length[row]]).replace(bytes([comma]), b"").replace(bytes([point]), b".")
        if sound[row] or _EXPONENT.fullmatch(bare):
            values[row] = float(bare)
    return values
