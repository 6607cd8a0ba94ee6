"""Keep: a log that arrived for a loop becomes a file, rows and a job, each of them once."""

from __future__ import annotations

import asyncio
from datetime import UTC, datetime
from pathlib import Path

from service.store import Accepted, Store
from service.work.dispatcher import CUT_OFF, Dispatcher
from service.work.loop_settings import LoopSettings
from service.work.options import Options

# Where the service was to blame, the same log sent again is tried again.
TRY_AGAIN = frozenset({"internal", "time-limit", "upload-damaged", "worker-lost", CUT_OFF.code})


async def keep(store: Store, dispatcher: Dispatcher, loop: str, log: Path, given: Options) -> Accepted:
    """Keep a log and queue what is asked of it; once this returns, neither is lost.

    log     a file that may be gone afterwards
    given   the options that came with the log; the loop's stand in for the rest
    The same bytes with the same options are kept once, whoever sends them and however often.
    """
    accepted = await asyncio.to_thread(_keep, store, loop, log, given)
    dispatcher.wake()
    return accepted


def _keep(store: Store, loop: str, log: Path, given: Options) -> Accepted:
    known = store.loops.get(loop)
    settings = LoopSettings.model_validate_json(known.settings) if known else LoopSettings()
    return store.logs.accept(
        loop,
        store.uploads.put(log),
        log.stat().st_size,
        settings.options(given).text(),
        datetime.now(UTC),
        loop_settings=LoopSettings().model_dump_json(),
        try_again=TRY_AGAIN,
    )
