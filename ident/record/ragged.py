"""Lines with another number of fields than the table, or with a quote left open: made blank and counted."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Ints = NDArray[np.int64]

_NEWLINE, _QUOTE = 10, 34
# More short lines than this share leave their last cells out by habit: those cells are blank.
SHORT_SHARE = 0.02
FEW = 3


@dataclass(frozen=True, slots=True, eq=False)
class Combed:
    """A block of lines of one width.

    text      UTF-8; lines that were taken out are blank, so that the others keep their number
    lines     how many
    notes     lines (from 0) with one field: comments, a footer
    ragged    lines of another width, and their fields
    unclosed  lines with a quote left open
    """

    text: bytes
    lines: int
    notes: Ints
    ragged: Ints
    fields: Ints
    unclosed: Ints


def comb(block: bytes, delimiter: str, width: int) -> Combed:
    """Take out of a block of whole lines what is no row of `width` fields.

    block    UTF-8, \\n line ends, the last line with or without
    """
    text = block if block.endswith(b"\n") else block + b"\n"
    mark = delimiter.encode()
    bytes_ = np.frombuffer(text, dtype=np.uint8)
    lines = int(np.count_nonzero(bytes_ == _NEWLINE))  # several times faster than bytes.count
    none = np.zeros(0, dtype=np.int64)
    if int(np.count_nonzero(bytes_ == mark[0])) == (width - 1) * lines and b'"' not in text:
        return Combed(text, lines, none, none, none, none)
    ends = np.flatnonzero(bytes_ == _NEWLINE)
    starts = np.concatenate(([0], ends[:-1] + 1))
    marks = bytes_ == mark[0]
    unclosed = np.zeros(lines, dtype=np.bool_)
    if b'"' in text:
        inside = np.bitwise_xor.accumulate(bytes_ == _QUOTE)
        before = np.concatenate(([False], inside[ends[:-1]]))
        # Each line on its own: one open quote must not turn the rest of the log inside out.
        unclosed = inside[ends] != before
        marks &= inside == np.repeat(before, ends - starts + 1)
    fields = np.add.reduceat(marks, starts, dtype=np.int64) + 1
    blank = ends == starts
    short, longer = (fields < width) & ~blank, fields > width
    surplus = _empty_ends(text, np.flatnonzero(longer & ~unclosed), starts, ends, mark, width)
    longer[[i for i, _ in surplus]] = False
    notes = (fields == 1) & ~blank & ~unclosed & (width > 1)
    short &= ~notes
    if np.count_nonzero(short) > max(FEW, SHORT_SHARE * lines):
        short[:] = False
    ragged = (short | longer) & ~unclosed
    out = notes | ragged | unclosed
    if out.any() or surplus:
        keep = ~np.repeat(out, ends - starts + 1)
        keep[ends] = True
        for i, beyond in surplus:
            keep[beyond : ends[i]] = False
        text = bytes_[keep].tobytes()
    at = np.flatnonzero(ragged)
    return Combed(text, lines, np.flatnonzero(notes), at, fields[at], np.flatnonzero(unclosed))


def _empty_ends(text: bytes, lines: Ints, starts: Ints, ends: Ints, mark: bytes, width: int) -> list[tuple[int, int]]:
    """Longer lines whose fields beyond the width are empty (trailing delimiters), and where these begin."""
    found = []
    for i in lines[:1000].tolist():
        line = text[starts[i] : ends[i]]
        parts = line.split(mark)
        if b'"' not in line and not any(p.strip() for p in parts[width:]):
            found.append((i, int(starts[i]) + len(mark.join(parts[:width]))))
    return found
