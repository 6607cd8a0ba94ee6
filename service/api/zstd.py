"""Zstandard (RFC 8878, several frames allowed), unpacked as it arrives, a little at a time."""

from __future__ import annotations

import asyncio
from collections.abc import AsyncGenerator, AsyncIterator

from zstandard import ZstdDecompressor, ZstdError

from service.errors import ProblemError

# A block of a few bytes may unpack to 128 KiB, so pieces are fed in slices that stay below some megabytes unpacked.
SLICE = 256
WINDOW = 2**25  # bytes of history that a frame may ask for: no level below the "ultra" ones needs more


async def unpack_zstd(pieces: AsyncIterator[bytes]) -> AsyncGenerator[bytes, None]:
    """The unpacked bytes, in small parts, so that whoever counts them can stop a bomb early.

    Raises ProblemError: broken-zstd, for a stream that is cut short, damaged, or asks for too much memory.
    """
    unpacker = ZstdDecompressor(max_window_size=WINDOW)
    frame, begun = unpacker.decompressobj(), False
    async for packed in pieces:
        for at in range(0, len(packed), SLICE):
            rest = packed[at : at + SLICE]
            while rest:
                if frame.eof:
                    frame = unpacker.decompressobj()
                begun = True
                try:
                    yield frame.decompress(rest)
                except ZstdError as error:
                    raise ProblemError(
                        "broken-zstd", f"The body is not zstd, or is damaged ({error}). Pack the log again."
                    ) from error
                rest = frame.unused_data if frame.eof else b""
            await asyncio.sleep(0)  # other requests get their turn
    if begun and not frame.eof:
        raise ProblemError("broken-zstd", "The zstd stream ends before its end. Send the log again, whole.")
