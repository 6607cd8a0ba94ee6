"""Lane: one worker process that takes one log at a time and is replaced when it is lost.

A pool of several workers fails every log in it when one worker dies, and a running task can only be ended
by killing its process. With one process per lane, a crash or a time-out costs the log that caused it and
no other.
"""

from __future__ import annotations

import asyncio
import os
import signal
from collections.abc import Callable
from concurrent.futures import BrokenExecutor, Future, ProcessPoolExecutor
from contextlib import suppress
from multiprocessing.context import BaseContext
from pathlib import Path
from typing import Any

from service.errors import Problem
from service.work.options import Options
from service.work.stages import STAGES, Stage
from service.work.worker import prepare

Answer = bytes | Problem
Source = bytes | Path  # a log in a file, or JSON
Task = Callable[[Any, Options], Answer]  # of one kind of source

LOST = Problem("worker-lost", "The process that analysed this log died and was replaced. Send the log again.")


class Lane:
    """One worker process, started when needed."""

    def __init__(self, context: BaseContext, task: Task) -> None:
        self._context = context
        self._task = task
        self._executor: ProcessPoolExecutor | None = None
        self._stage = Stage(context)
        self.pid: int | None = None
        self.starts = 0

    def open(self) -> None:
        """Start the process and wait until it answers. Blocks: call it from a thread."""
        executor = ProcessPoolExecutor(1, mp_context=self._context, initializer=prepare, initargs=(self._stage,))
        try:
            self.pid = executor.submit(os.getpid).result()
        except BaseException:
            executor.shutdown(wait=False)
            raise
        self._executor = executor
        self.starts += 1

    def close(self) -> None:
        """End the process, whatever it is doing."""
        executor, pid, self._executor, self.pid = self._executor, self.pid, None, None
        if executor is not None and pid is not None:
            with suppress(ProcessLookupError, PermissionError):
                os.kill(pid, getattr(signal, "SIGKILL", signal.SIGTERM))
            executor.shutdown(wait=False, cancel_futures=True)

    @property
    def stage(self) -> str:
        """What its process is at, of `stages.STAGES`."""
        return self._stage.get()

    async def run(self, source: Source, options: Options, limit_s: float, task: Task | None = None) -> Answer:
        """What the task returns, or the problem that the process died or took more than `limit_s` seconds.

        task   None: the lane's own
        """
        try:
            future = await self._submit(task or self._task, source, options)
            return await asyncio.wait_for(asyncio.wrap_future(future), limit_s)
        except BrokenExecutor:
            self.close()
            return LOST
        except TimeoutError:
            self.close()
            return Problem(
                "time-limit",
                f"This log took longer than {limit_s:g} s to analyse. Send a shorter or coarser one, "
                "or let the operator raise GAINWRIGHT_TIME_LIMIT_S.",
                {"time_limit_s": limit_s},
            )
        except BaseException:
            # Cancelled: nobody waits for the answer, and the next log must not queue behind it.
            self.close()
            raise

    async def _submit(self, task: Task, source: Source, options: Options) -> Future[Answer]:
        self._stage.set(STAGES[0])
        if self._executor is not None:
            try:
                return self._executor.submit(task, source, options)
            except BrokenExecutor:
                self.close()  # died while idle: this log is not to blame
        await asyncio.to_thread(self.open)
        assert self._executor is not None
        return self._executor.submit(task, source, options)
