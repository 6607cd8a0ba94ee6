"""Workers: the lanes of the service, and how many logs may wait for one."""

from __future__ import annotations

import asyncio
from collections.abc import AsyncIterator, Iterator
from contextlib import asynccontextmanager, contextmanager

from service.errors import ProblemError
from service.work.lane import Answer, Lane, Source, Task
from service.work.options import Options
from service.work.report import report_bytes
from service.work.worker import context


class Workers:
    """Analyses logs in `count` processes, never in the caller's own.

    max_waiting   logs admitted beyond those being analysed
    time_limit_s  per log, from the moment a process takes it
    """

    def __init__(self, count: int, max_waiting: int, time_limit_s: float, task: Task = report_bytes) -> None:
        self.count = count
        self._lanes = tuple(Lane(context(), task) for _ in range(count))
        self._idle: asyncio.Queue[Lane] = asyncio.Queue()
        self._places = count + max_waiting
        self.time_limit_s = time_limit_s
        self.admitted = 0
        self.ready = False

    async def start(self) -> None:
        """Start every process and wait until all of them answer."""
        await asyncio.gather(*(asyncio.to_thread(lane.open) for lane in self._lanes))
        for lane in self._lanes:
            self._idle.put_nowait(lane)
        self.ready = True

    def stop(self) -> None:
        self.ready = False
        for lane in self._lanes:
            lane.close()

    @property
    def replaced(self) -> int:
        """Processes started to replace lost ones."""
        return sum(max(lane.starts - 1, 0) for lane in self._lanes)

    @property
    def pids(self) -> tuple[int, ...]:
        return tuple(lane.pid for lane in self._lanes if lane.pid is not None)

    @contextmanager
    def admit(self) -> Iterator[None]:
        """Hold one place from before a log is received, for the room that logs take is what has to be bounded.

        Raises ProblemError: busy.
        """
        if self.admitted >= self._places:
            raise ProblemError(
                "busy",
                "All processes are taken and the queue is full. Send the log again in a few seconds.",
                {"admitted": self.admitted},
            )
        self.admitted += 1
        try:
            yield
        finally:
            self.admitted -= 1

    @asynccontextmanager
    async def lane(self) -> AsyncIterator[Lane]:
        """One process to oneself, once one is free; first come, first served."""
        lane = await self._idle.get()
        try:
            yield lane
        finally:
            self._idle.put_nowait(lane)

    async def run(self, source: Source, options: Options, task: Task | None = None) -> Answer:
        """The report's JSON or a problem, once a process is free.

        task   something else to do there than what these workers are for
        """
        async with self.lane() as lane:
            return await lane.run(source, options, self.time_limit_s, task)
