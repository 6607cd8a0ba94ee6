"""Uploads: every log as it was sent, zstd-compressed, in a file named by the SHA-256 of its bytes.

A file is complete under its name or not there at all: written beside it, synced, renamed, and the folder synced.
A log is never in memory whole: it arrives in a file, is packed from there, and is unpacked into one to be read.
"""

from __future__ import annotations

import hashlib
import os
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import BinaryIO

import zstandard

from service.errors import ProblemError

LEVEL = 3
PIECE = 2**20


class Uploads:
    """The folder of uploads."""

    def __init__(self, folder: Path) -> None:
        self._folder = folder

    @contextmanager
    def part(self, folder: Path | None = None) -> Iterator[Path]:
        """An empty file of one's own, removed at the end unless renamed; what a kill leaves goes at the next start.

        folder   None: the one of logs that arrive or are being read
        """
        folder = folder or self._folder / "parts"
        folder.mkdir(parents=True, exist_ok=True)
        descriptor, name = tempfile.mkstemp(prefix="part-", dir=folder)
        os.close(descriptor)
        try:
            yield Path(name)
        finally:
            Path(name).unlink(missing_ok=True)

    def put(self, log: Path) -> str:
        """Keep a file's bytes; the answer is their SHA-256. Once this returns they survive a power failure."""
        with log.open("rb") as source:
            sha256 = hashlib.file_digest(source, "sha256").hexdigest()
        file = self._file(sha256)
        if file.exists():
            return sha256
        with self.part(file.parent) as name:
            with log.open("rb") as source, name.open("wb") as part:
                packer = zstandard.ZstdCompressor(LEVEL, write_checksum=True)
                packer.copy_stream(source, part, size=log.stat().st_size, read_size=PIECE, write_size=PIECE)
                part.flush()
                os.fsync(part.fileno())
            os.replace(name, file)
        for folder in (file.parent, self._folder):
            sync(folder)
        return sha256

    def get(self, sha256: str, into: Path) -> None:
        """The bytes again, written to a file.

        Raises ProblemError upload-damaged; the damaged file is set aside, so that the log can be sent again.
        """
        file = self._file(sha256)
        try:
            with file.open("rb") as packed:
                found = _unpacked(packed, into)
        except FileNotFoundError:
            found = ""
        if found == sha256:
            return
        if file.exists():
            os.replace(file, file.with_suffix(".damaged"))
        raise ProblemError(
            "upload-damaged",
            "The kept copy of this log is missing or damaged. Send the log again.",
            {"sha256": sha256},
        )

    def remove_parts(self) -> None:
        """Remove what uploads that were cut off by a kill left behind; nobody may be writing."""
        for part in self._folder.glob("*/part-*"):
            part.unlink(missing_ok=True)

    def _file(self, sha256: str) -> Path:
        return self._folder / sha256[:2] / f"{sha256}.zst"


def _unpacked(packed: BinaryIO, into: Path) -> str:
    """Unpack a file into another; the SHA-256 of what came out, "" where it is damaged."""
    digest = hashlib.sha256()
    with into.open("wb") as log, zstandard.ZstdDecompressor().stream_reader(packed, read_size=PIECE) as source:
        try:
            while piece := source.read(PIECE):
                digest.update(piece)
                log.write(piece)
        except zstandard.ZstdError:
            return ""
    return digest.hexdigest()


def sync(folder: Path) -> None:
    """Make the names in a folder durable, where the system knows how."""
    if os.name == "posix":
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
