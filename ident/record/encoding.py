"""From a source to UTF-8 bytes: byte order marks, Windows-1252, power-cut tails, and what is no text."""

from __future__ import annotations

import codecs
import hashlib
import os
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

from ident.errors import ReadError
from ident.findings import Finding

LogSource = str | os.PathLike[str] | bytes | bytearray | memoryview | BinaryIO

_MARKS = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF32_LE, "utf-32-le"),  # before UTF-16, whose mark it starts with
    (codecs.BOM_UTF32_BE, "utf-32-be"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
_PROBE = 65536
_CONTROLS = bytes(set(range(32)) - set(b"\t\n\r\f"))


@dataclass(frozen=True, slots=True)
class Body:
    """The text of a log as UTF-8 bytes without a byte order mark."""

    text: bytes
    sha256: str
    findings: tuple[Finding, ...]


def load(source: LogSource) -> Body:
    """Read a path, bytes or a binary file to UTF-8 bytes.

    Raises ReadError: no-file, empty-log, not-text.
    """
    raw = _bytes(source)
    sha256 = hashlib.sha256(raw).hexdigest()
    text, findings = _utf8(raw)
    text, cut = _without_nul_tail(text)
    if not text.strip():
        if raw.strip(b"\0\r\n\t ") not in (b"", *(mark for mark, _ in _MARKS)):
            raise ReadError("not-text", _NOT_TEXT)
        raise ReadError("empty-log", "The log is empty: send the rows of a CSV file.", {"bytes": len(raw)})
    probe = text[:_PROBE]
    if b"\0" in text or len(probe) - len(probe.translate(None, _CONTROLS)) > len(probe) // 100:
        raise ReadError("not-text", _NOT_TEXT)
    return Body(text, sha256, (*findings, *cut))


_NOT_TEXT = (
    "This is not a text file (a picture, a spreadsheet, an archive?): export the log as CSV, in UTF-8 or with a "
    "byte order mark."
)


def _bytes(source: LogSource) -> bytes:
    if isinstance(source, bytes):
        return source
    if isinstance(source, bytearray | memoryview):
        return bytes(source)
    if isinstance(source, str | os.PathLike):
        try:
            return Path(source).read_bytes()
        except (OSError, ValueError) as cause:
            raise ReadError("no-file", "The log file cannot be opened: check its path and rights.") from cause
    content = source.read()
    if not isinstance(content, bytes):
        raise TypeError("read_csv needs a binary file: open it with mode 'rb'")
    return content


def _utf8(raw: bytes) -> tuple[bytes, list[Finding]]:
    for mark, name in _MARKS:
        if raw.startswith(mark):
            body = raw[len(mark) :]
            if name == "utf-8":
                break
            try:
                return body.decode(name).encode(), []
            except UnicodeError as cause:
                raise ReadError("not-text", f"The file says it is {name} but is damaged: export it again.") from cause
    else:
        body = raw
    try:
        body.decode()
        return body, []
    except UnicodeDecodeError:
        pass
    if b"\0" in body.rstrip(b"\0"):
        raise ReadError("not-text", _NOT_TEXT)
    try:
        text = body.decode("cp1252").encode()
    except UnicodeDecodeError as cause:
        raise ReadError("not-text", _NOT_TEXT, {"byte": cause.start}) from cause
    return text, [
        Finding(
            "encoding-assumed",
            "warning",
            "The log is not UTF-8 and has no byte order mark; it was read as Windows-1252. Check "
            "the headers and units.",
            {"encoding": "cp1252"},
        )
    ]


def _without_nul_tail(text: bytes) -> tuple[bytes, list[Finding]]:
    kept = text.rstrip(b"\0\r\n\t ")
    tail = text[len(kept) :]
    nuls = tail.count(b"\0")
    if nuls == 0:
        return text, []
    cut = not tail.startswith((b"\n", b"\r"))
    if cut:
        # The last line was being written when the power went: a number cut short still parses.
        kept = kept[: max(kept.rfind(b"\n"), kept.rfind(b"\r")) + 1]
    return kept, [
        Finding(
            "truncated-tail",
            "warning",
            "The file ends in NUL bytes, as after a power cut; they were dropped"
            + (", and so was the incomplete last line." if cut else "."),
            {"nul_bytes": nuls, "rows_dropped": int(cut)},
        )
    ]
