"""Gzip (RFC 1952, several members allowed), unpacked as it arrives, never more than a piece at a time."""

from __future__ import annotations

import asyncio
import zlib
from collections.abc import AsyncGenerator, AsyncIterator

from service.errors import ProblemError

GZIP = 31  # wbits: largest window, gzip wrapping demanded
PIECE = 2**20


async def gunzip(pieces: AsyncIterator[bytes]) -> AsyncGenerator[bytes, None]:
    """The unpacked bytes, at most PIECE at a time, so that whoever counts them can stop a bomb early.

    Raises ProblemError: broken-gzip, for a stream that is cut short or is no gzip.
    """
    member = zlib.decompressobj(GZIP)
    begun = False
    async for packed in pieces:
        rest = packed
        while rest:
            if member.eof:
                member = zlib.decompressobj(GZIP)
            begun = True
            try:
                piece = member.decompress(rest, PIECE)
            except zlib.error as error:
                raise ProblemError(
                    "broken-gzip", f"The body is not gzip, or is damaged ({error}). Pack the log again."
                ) from error
            yield piece
            rest = member.unused_data if member.eof else member.unconsumed_tail
            if rest:
                await asyncio.sleep(0)  # other requests get their turn between the pieces of a dense one
    if begun and not member.eof:
        raise ProblemError("broken-gzip", "The gzip stream ends before its end. Send the log again, whole.")
