"""From a source to blocks of UTF-8 lines: byte order marks, Windows-1252, power-cut tails, and what is no text.

The source is read twice, first to learn its encoding and end, then block by block, so that the text of a log
is never in memory whole unless the caller brought it so, or brought a pipe.
"""

from __future__ import annotations

import codecs
import hashlib
import io
import os
from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

from ident.errors import ReadError
from ident.findings import Finding
from ident.record.quote import counted

LogSource = str | os.PathLike[str] | bytes | bytearray | memoryview | BinaryIO

Opened = Callable[[], AbstractContextManager[BinaryIO]]

BLOCK = 2**23
LONGEST_LINE = 2**20
_MARKS = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF32_LE, "utf-32-le"),  # before UTF-16, whose mark it starts with
    (codecs.BOM_UTF32_BE, "utf-32-be"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
_PROBE = 65536
_CONTROLS = bytes(set(range(32)) - set(b"\t\n\r\f"))
# A power cut leaves some; text of two bytes a character without a mark is half of them.
_NULS = 0.2
_EMPTY = b"\0\r\n"
_NOT_TEXT = (
    "This is not a text file (a picture, a spreadsheet, an archive?): export the log as CSV, in UTF-8 or with a "
    "byte order mark."
)


@dataclass(frozen=True, slots=True, eq=False)
class Body:
    """The text of a log.

    head        its first bytes as UTF-8 with \\n line ends, at least one line beyond LONGEST_LINE or all of it
    encoding    utf-8, utf-16-le, cp1252, ...
    complete    the last line has its line end
    """

    head: bytes
    sha256: str
    encoding: str
    complete: bool
    findings: tuple[Finding, ...]
    _open: Opened
    _mark: int
    _size: int

    def blocks(self, offset: int = 0) -> Iterator[bytes]:
        """Whole lines as UTF-8 with \\n line ends and no NUL, from `offset` bytes of `head` on.

        Raises ReadError: line-too-long.
        """
        kept, skip, ready = b"", offset, b""
        for chunk in _unended(_decoded(self._open, self.encoding, self._mark), self._size):
            text = kept + chunk
            end = text.rfind(b"\n") + 1
            if len(text) - end > LONGEST_LINE:
                raise _too_long()
            kept, lines = text[end:], _without_nuls(text[:end])
            if ready:
                yield ready
            ready, skip = lines[skip:], max(skip - len(lines), 0)
        ready += _without_nuls(kept)[skip:]
        if ready:
            yield ready


def load(source: LogSource) -> Body:
    """Open a path, bytes or a binary file, and find out how its text is written.

    Raises ReadError: no-file, empty-log, not-text, line-too-long.
    """
    opened = _opener(source)
    start = _first_bytes(opened, 4)
    mark, encoding = next(((len(m), name) for m, name in _MARKS if start.startswith(m)), (0, "utf-8"))
    findings = []
    try:
        end = _scan(opened, encoding, mark)
    except UnicodeError as cause:
        if mark:
            raise ReadError("not-text", f"The file says it is {encoding} but is damaged: export it again.") from cause
        encoding = "cp1252"
        try:
            end = _scan(opened, encoding, mark)
        except UnicodeError as again:
            raise ReadError("not-text", _NOT_TEXT) from again
        findings.append(
            Finding(
                "encoding-assumed",
                "warning",
                "The log is not UTF-8 and has no byte order mark; it was read as Windows-1252. Check "
                "the headers and units.",
                {"encoding": encoding},
            )
        )
    probe = _first_text(opened, encoding, mark, _PROBE)
    probe = probe[: end.text]
    if not probe.strip() and end.text <= _PROBE:
        raise ReadError("empty-log", "The log is empty: send the rows of a CSV file.", {"bytes": end.size})
    controls = len(probe) - len(probe.translate(None, _CONTROLS)) - probe.count(b"\0")
    if end.nuls > _NULS * end.text or controls > len(probe) // 100:
        raise ReadError("not-text", _NOT_TEXT)
    size, cut = end.text, end.tail_nuls > 0 and not end.ended
    if cut:
        # The last line was being written when the power went: a number cut short still parses.
        size = end.last_line
    if end.tail_nuls:
        findings.append(
            Finding(
                "truncated-tail",
                "warning",
                "The file ends in NUL bytes, as after a power cut; they were dropped"
                + (", and so was the incomplete last line." if cut else "."),
                {"nul_bytes": end.tail_nuls, "rows_dropped": int(cut)},
            )
        )
    if end.nuls:
        message = (
            f"The file holds {counted(end.nuls, 'NUL byte', 'NUL bytes')}, as after a power cut; the lines with one "
            "were dropped."
        )
        findings.append(Finding("nul-bytes", "warning", message, {"count": end.nuls}))
    head = _without_nuls(b"".join(_unended(_decoded(opened, encoding, mark, LONGEST_LINE + _PROBE), size)))
    if len(head) > LONGEST_LINE and max(map(len, head.split(b"\n"))) > LONGEST_LINE:
        raise _too_long()
    complete = end.ended or end.tail_nuls > 0
    return Body(head, end.sha256, encoding, complete, tuple(findings), opened, mark, size)


@dataclass(frozen=True, slots=True)
class _End:
    """What a pass over the whole text found; sizes in bytes of UTF-8.

    text       up to the last byte that is no NUL, blank or line end
    last_line  start of the line that byte stands in
    ended      a line end follows it, before any NUL
    """

    sha256: str
    size: int
    text: int
    last_line: int
    ended: bool
    nuls: int
    tail_nuls: int


def _scan(opened: Opened, encoding: str, mark: int) -> _End:
    digest = hashlib.sha256()
    size = text = last_line = nuls = tail_nuls = newline = 0
    ended = False
    for chunk in _decoded(opened, encoding, mark, digest=digest.update, checked=True):
        kept = chunk.rstrip(_EMPTY)
        if kept:
            nuls += tail_nuls + (kept.count(0) if b"\0" in kept else 0)
            text, tail_nuls = size + len(kept), 0
            found = max(kept.rfind(b"\n"), kept.rfind(b"\r"))
            newline = size + found + 1 if found >= 0 else newline
            last_line = newline
            ended = chunk[len(kept) : len(kept) + 1] in (b"\n", b"\r")
        elif text == size:
            ended = chunk[:1] in (b"\n", b"\r")
        rest = chunk[len(kept) :]
        found = max(rest.rfind(b"\n"), rest.rfind(b"\r"))
        newline = size + len(kept) + found + 1 if found >= 0 else newline
        tail_nuls += rest.count(b"\0")
        size += len(chunk)
    return _End(digest.hexdigest(), size, text, last_line, ended, nuls, tail_nuls)


def _decoded(
    opened: Opened,
    encoding: str,
    mark: int,
    most: int | None = None,
    digest: Callable[[bytes], object] = lambda _: None,
    checked: bool = False,
) -> Iterator[bytes]:
    """The text as chunks of UTF-8, after the byte order mark."""
    decoder = codecs.getincrementaldecoder(encoding)()
    with opened() as file:
        digest(file.read(mark))
        left = most if most is not None else 1 << 62
        while left > 0:
            raw = file.read(min(BLOCK, left))
            left -= len(raw)
            digest(raw)
            if encoding != "utf-8" or checked:
                # A character may be cut by the end of a probe, not by the end of the file.
                text = decoder.decode(raw, final=not raw and most is None)
            if encoding == "utf-8":
                yield raw
            else:
                yield text.encode()
            if not raw:
                return


def _unended(chunks: Iterator[bytes], size: int) -> Iterator[bytes]:
    """At most `size` bytes of the chunks, every line end as \\n."""
    left, held = size, b""
    for chunk in chunks:
        text = held + chunk[:left]
        left -= len(chunk)
        # A pair of line-end bytes may be parted by the end of a chunk.
        held = b"\r" if text.endswith(b"\r") and left > 0 else b""
        text = text[: len(text) - len(held)]
        if b"\r" in text:
            text = text.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
        if text:
            yield text
        if left <= 0:
            return


def _without_nuls(lines: bytes) -> bytes:
    """Lines that hold a NUL made blank, so that the others keep their number."""
    if b"\0" not in lines:
        return lines
    return b"\n".join(b"" if b"\0" in line else line for line in lines.split(b"\n"))


def _first_text(opened: Opened, encoding: str, mark: int, most: int) -> bytes:
    return b"".join(_decoded(opened, encoding, mark, most))


def _first_bytes(opened: Opened, count: int) -> bytes:
    with opened() as file:
        return file.read(count)


def _opener(source: LogSource) -> Opened:
    """What opens the source anew at its start, as often as wanted."""
    if isinstance(source, str | os.PathLike):
        path = Path(source)
        try:
            path.open("rb").close()
        except (OSError, ValueError) as cause:
            raise ReadError("no-file", "The log file cannot be opened: check its path and rights.") from cause
        return lambda: path.open("rb")
    if isinstance(source, bytes | bytearray | memoryview):
        held = bytes(source)
        return lambda: io.BytesIO(held)
    if not isinstance(source.read(0), bytes):
        raise TypeError("read_csv needs a binary file: open it with mode 'rb'")
    if not source.seekable():
        content = source.read()  # a pipe can be read once only
        return lambda: io.BytesIO(content)
    begin = source.tell()
    return lambda: _rewound(source, begin)


def _rewound(file: BinaryIO, begin: int) -> AbstractContextManager[BinaryIO]:
    """The caller's own file, to be read from there again and left open."""
    file.seek(begin)
    return nullcontext(file)


def _too_long() -> ReadError:
    return ReadError(
        "line-too-long",
        f"A line is longer than {LONGEST_LINE} bytes: export the log with one sample per line.",
        {"longest_bytes": LONGEST_LINE},
    )
