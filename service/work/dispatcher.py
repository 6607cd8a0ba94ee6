"""Dispatcher: takes queued jobs to free worker processes and writes down how they end.

One runner per process. A runner waits for news, waits for a free process, claims the job that has waited longest,
and renews its lease while the process works. A job that was running when the service died is put back at the next
start, or when its lease has run out; after its last attempt it ends as failed.
"""

from __future__ import annotations

import asyncio
import logging
import secrets
from collections.abc import AsyncIterator, Callable, Coroutine
from contextlib import asynccontextmanager, suppress
from datetime import UTC, datetime, timedelta
from time import monotonic
from typing import Any

from service.errors import Problem, ProblemError
from service.store import Analysis, Job, Store
from service.store.jobs import Result
from service.work.lane import LOST, Answer, Lane
from service.work.numbers import numbers_of, parse, start_of, write_numbers
from service.work.options import Options
from service.work.report import INTERNAL
from service.work.stages import STAGES, STORING, progress
from service.work.workers import Workers

log = logging.getLogger("gainwright.work")

LEASE = timedelta(seconds=60)
RENEW_S = 20.0
LOOK_S = 0.2  # how often a running job's stage is looked at
RECLAIM_S = 15.0
RETRY_S = 1.0  # after a fault of the store

CUT_OFF = Problem(
    "cut-off",
    "The analysis of this log was cut off three times: its process, or the whole service, died each time. "
    "Send the log again to try once more, a shorter span of it if that fails too.",
)


class Dispatcher:
    """Runs from `start` to `stop`, on one event loop.

    ended   called with the outcome of every analysis
    """

    def __init__(self, store: Store, workers: Workers, ended: Callable[[Answer], None]) -> None:
        self._store = store
        self._workers = workers
        self._ended = ended
        self._owner = secrets.token_hex(8)
        self._news = asyncio.Event()
        self._waiting: dict[str, set[asyncio.Event]] = {}
        self._tasks: list[asyncio.Task[None]] = []

    async def start(self) -> None:
        await self._reclaim(everybody=self._store.alone)
        self._tasks = [asyncio.create_task(self._run()) for _ in range(self._workers.count)]
        self._tasks.append(asyncio.create_task(self._reclaim_for_ever()))

    async def stop(self) -> None:
        """Put the running jobs back and end."""
        for task in self._tasks:
            task.cancel()
        await asyncio.gather(*self._tasks, return_exceptions=True)
        self._tasks = []
        await asyncio.to_thread(self._store.jobs.release, self._owner)

    def wake(self) -> None:
        """Say that there may be something to do."""
        self._news.set()

    async def wait(self, analysis: Analysis, seconds: float) -> Analysis:
        """The analysis as it stands when it has ended, or after so many seconds."""
        end = monotonic() + seconds
        with self._bell(analysis.id) as bell:
            while True:
                now = await asyncio.to_thread(self._store.logs.analysis, analysis.id)
                analysis = now or analysis
                left = end - monotonic()
                if analysis.status in ("done", "failed") or left <= 0.0:
                    return analysis
                # Another service on the same database may end it without ringing here.
                with suppress(TimeoutError):
                    await asyncio.wait_for(bell.wait(), min(left, RETRY_S))

    def _bell(self, id: str) -> Bell:
        return Bell(self._waiting, id)

    async def _run(self) -> None:
        while True:
            await self._news.wait()
            try:
                async with self._workers.lane() as lane:
                    # Cleared before looking: news that come while we look are not lost.
                    self._news.clear()
                    job = await asyncio.to_thread(self._store.jobs.claim, self._owner, STAGES[0], _now(), LEASE)
                    if job is not None:
                        self._news.set()  # there may be more
                        await self._do(lane, job)
            except Exception:
                log.exception("a job could not be taken or ended; its lease will run out")
                await asyncio.sleep(RETRY_S)
                self._news.set()

    async def _do(self, lane: Lane, job: Job) -> None:
        try:
            with self._store.uploads.part() as file:
                await asyncio.to_thread(self._store.uploads.get, job.sha256, file)
                options = Options.model_validate_json(job.options)
                async with _running(lane.run(file, options, self._workers.time_limit_s)) as working:
                    if not await self._attend(lane, job, working):
                        return
                    answer = working.result()
        except ProblemError as error:
            answer = error.problem
        if answer == LOST:
            await asyncio.to_thread(self._store.jobs.lost, job, CUT_OFF, _now())
        else:
            if not isinstance(answer, Problem):
                await self._tell(job, STORING)
            result = answer if isinstance(answer, Problem) else await asyncio.to_thread(_result, answer)
            await asyncio.to_thread(self._store.jobs.finish, job, result, _now())
        self._ended(answer)
        for bell in self._waiting.get(job.id, ()):
            bell.set()

    async def _attend(self, lane: Lane, job: Job, working: asyncio.Task[Answer]) -> bool:
        """Write down the stages and renew the lease until the work is done; False where the lease is lost."""
        told, renewed = STAGES[0], monotonic()
        while not (await asyncio.wait({working}, timeout=LOOK_S))[0]:
            stage = lane.stage
            if stage == told and monotonic() - renewed < RENEW_S:
                continue
            told, renewed = stage, monotonic()
            if not await self._tell(job, stage):
                return False
        return True

    async def _tell(self, job: Job, stage: str) -> bool:
        """Write down the stage and renew the lease; False where the lease is lost."""
        return await asyncio.to_thread(self._store.jobs.renew, job, stage, progress(stage), _now(), LEASE)

    async def _reclaim(self, *, everybody: bool) -> None:
        left = await asyncio.to_thread(self._store.jobs.reclaim, CUT_OFF, _now(), everybody=everybody)
        if left:
            log.warning("%d analyses had been cut off and were put back", left)
        self._news.set()

    async def _reclaim_for_ever(self) -> None:
        while True:
            await asyncio.sleep(RECLAIM_S)
            try:
                await self._reclaim(everybody=False)
            except Exception:
                log.exception("jobs whose lease has run out could not be put back")


class Bell:
    """An event that rings when one analysis has ended, known to the dispatcher while somebody listens."""

    def __init__(self, listening: dict[str, set[asyncio.Event]], id: str) -> None:
        self._listening, self._id, self._event = listening, id, asyncio.Event()

    def __enter__(self) -> asyncio.Event:
        self._listening.setdefault(self._id, set()).add(self._event)
        return self._event

    def __exit__(self, *_: object) -> None:
        others = self._listening[self._id]
        others.discard(self._event)
        if not others:
            del self._listening[self._id]


@asynccontextmanager
async def _running(work: Coroutine[Any, Any, Answer]) -> AsyncIterator[asyncio.Task[Answer]]:
    """The work as a task that does not outlive this block."""
    task = asyncio.create_task(work)
    try:
        yield task
    finally:
        task.cancel()
        await asyncio.gather(task, return_exceptions=True)


def _result(report: bytes) -> Result | Problem:
    """What is kept of a report; a report that cannot be taken apart is a fault of the program."""
    try:
        told = parse(report)
        return Result(report, start_of(told), write_numbers(numbers_of(told)))
    except Exception:
        log.exception("a report could not be taken apart")
        return INTERNAL


def _now() -> datetime:
    return datetime.now(UTC)
