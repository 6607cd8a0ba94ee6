"""The log in a request: raw, packed or a multipart field, received piece by piece into a file, under one limit.

request.stream() -> limited (as sent) -> gunzip or unpack_zstd -> limited (unpacked), or the form's `file` -> a file
"""

from __future__ import annotations

import asyncio
from collections.abc import AsyncGenerator, AsyncIterator
from contextlib import asynccontextmanager
from pathlib import Path

from starlette.datastructures import UploadFile
from starlette.formparsers import MultiPartException, MultiPartParser
from starlette.requests import Request

from service.api.gzip import gunzip
from service.api.state import state
from service.api.zstd import unpack_zstd
from service.errors import ProblemError

FIELD = "file"
PIECE = 2**20  # bytes written at a time


@asynccontextmanager
async def received(request: Request) -> AsyncIterator[Path]:
    """The log of a request in a file, decoded; the file is gone afterwards.

    Raises ProblemError: as `receive`.
    """
    service = state(request)
    with service.store.uploads.part() as file:
        await receive(request, file, service.settings.max_upload_bytes, service.settings.upload_time_limit_s)
        yield file


async def receive(request: Request, file: Path, limit: int, time_limit_s: float) -> None:
    """Write the log's bytes, decoded, to a file; a piece or two of it are in memory at a time.

    limit         bytes, as sent and unpacked
    time_limit_s  for all of it: a stalled upload must not hold its place for ever

    Raises ProblemError: too-large, too-slow, unsupported-encoding, broken-gzip, broken-zstd, broken-multipart,
    unexpected-field, no-file-field.
    """
    try:
        async with asyncio.timeout(time_limit_s):
            await _write(_decoded(request, limit), file)
    except TimeoutError:
        raise ProblemError(
            "too-slow",
            f"The log was not complete after {time_limit_s:g} s. Send it gzipped, or let the operator raise "
            "GAINWRIGHT_UPLOAD_TIME_LIMIT_S.",
            {"time_limit_s": time_limit_s},
        ) from None


async def _decoded(request: Request, limit: int) -> AsyncGenerator[bytes, None]:
    announced = request.headers.get("content-length", "")
    if announced.isdecimal() and int(announced) > limit:
        raise too_large(limit)
    pieces = limited(request.stream(), limit)
    encoding = request.headers.get("content-encoding", "identity").strip().lower()
    if encoding in ("gzip", "x-gzip"):
        pieces = limited(gunzip(pieces), limit)
    elif encoding == "zstd":
        pieces = limited(unpack_zstd(pieces), limit)
    elif encoding not in ("identity", ""):
        raise ProblemError(
            "unsupported-encoding",
            f"Content-Encoding {encoding!r} is not understood. Send the log plain, or as gzip or zstd.",
        )
    if request.headers.get("content-type", "").lower().startswith("multipart/form-data"):
        pieces = _from_form(request, pieces)
    async for piece in pieces:
        yield piece


def too_large(limit: int) -> ProblemError:
    return ProblemError(
        "too-large",
        f"The log is larger than the {limit:,} bytes accepted here. Send a shorter span or a coarser "
        "sampling, or let the operator raise GAINWRIGHT_MAX_UPLOAD_BYTES.",
        {"limit_bytes": limit},
    )


async def limited(pieces: AsyncIterator[bytes], limit: int) -> AsyncGenerator[bytes, None]:
    """The same pieces, until they are more than `limit` bytes."""
    size = 0
    async for piece in pieces:
        size += len(piece)
        if size > limit:
            raise too_large(limit)
        yield piece


async def _write(pieces: AsyncIterator[bytes], file: Path) -> None:
    with file.open("wb") as log:
        kept = bytearray()
        async for piece in pieces:
            kept += piece
            if len(kept) >= PIECE:
                # Another thread: a slow disk must not hold up the other requests.
                await asyncio.to_thread(log.write, kept)
                kept = bytearray()
        log.write(kept)


async def _from_form(request: Request, pieces: AsyncGenerator[bytes, None]) -> AsyncGenerator[bytes, None]:
    # The parser keeps a large file on disk too; its end is known only when the whole form has been read.
    try:
        form = await MultiPartParser(request.headers, pieces, max_files=1, max_fields=1).parse()
    except MultiPartException as error:
        raise ProblemError(
            "broken-multipart",
            f"The form cannot be read: {error.message} Send one file in the field {FIELD!r}.",
        ) from error
    try:
        others = sorted(name for name in form if name != FIELD)
        if others:
            raise ProblemError(
                "unexpected-field",
                f"The form has a field {others[0]!r} and takes only {FIELD!r}. Options belong in the "
                "address, such as /v1/reports?Ms=1.4.",
            )
        file = form.get(FIELD)
        if not isinstance(file, UploadFile):
            raise ProblemError("no-file-field", f"The form has no complete file in its field {FIELD!r}.")
        while piece := await file.read(PIECE):
            yield piece
    finally:
        await form.close()
