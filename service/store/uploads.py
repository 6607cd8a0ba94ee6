"""Uploads: every log as it was sent, zstd-compressed, in a file named by the SHA-256 of its bytes.

A file is complete under its name or not there at all: written beside it, synced, renamed, and the folder synced.
"""

from __future__ import annotations

import hashlib
import os
import tempfile
from pathlib import Path

import zstandard

from service.errors import ProblemError

LEVEL = 3


class Uploads:
    """The folder of uploads."""

    def __init__(self, folder: Path) -> None:
        self._folder = folder

    def put(self, source: bytes) -> str:
        """Keep the bytes; the answer is their SHA-256. Once this returns they survive a power failure."""
        sha256 = hashlib.sha256(source).hexdigest()
        file = self._file(sha256)
        if file.exists():
            return sha256
        file.parent.mkdir(parents=True, exist_ok=True)
        packed = zstandard.ZstdCompressor(LEVEL, write_checksum=True).compress(source)
        descriptor, name = tempfile.mkstemp(prefix="part-", dir=file.parent)
        try:
            with os.fdopen(descriptor, "wb") as part:
                part.write(packed)
                part.flush()
                os.fsync(part.fileno())
            os.replace(name, file)
        except BaseException:
            Path(name).unlink(missing_ok=True)
            raise
        for folder in (file.parent, self._folder):
            sync(folder)
        return sha256

    def get(self, sha256: str) -> bytes:
        """The bytes again.

        Raises ProblemError upload-damaged; the damaged file is set aside, so that the log can be sent again.
        """
        file = self._file(sha256)
        try:
            source = zstandard.ZstdDecompressor().decompress(file.read_bytes())
        except (OSError, zstandard.ZstdError):
            source = None
        if source is not None and hashlib.sha256(source).hexdigest() == sha256:
            return source
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


def sync(folder: Path) -> None:
    """Make the names in a folder durable, where the system knows how."""
    if os.name == "posix":
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
