"""Workers: a crash, a hang or a full queue costs the log that caused it, and no other."""

from __future__ import annotations

import asyncio
import os
import signal
import time
from collections.abc import Awaitable, Callable

import pytest
from lane_tasks import obey

from service.errors import Problem, ProblemError
from service.work.options import Options
from service.work.workers import Workers

OPTIONS = Options()


def within(count: int, use: Callable[[Workers], Awaitable[None]], *, limit_s: float = 60.0) -> None:
    async def run() -> None:
        workers = Workers(count, max_waiting=1, time_limit_s=limit_s, task=obey)
        await workers.start()
        try:
            await use(workers)
        finally:
            workers.stop()

    asyncio.run(run())


def code(answer: bytes | Problem) -> str | None:
    return answer.code if isinstance(answer, Problem) else None


def test_a_log_comes_back_from_another_process_with_one_blas_thread() -> None:
    async def use(workers: Workers) -> None:
        assert workers.ready
        assert await workers.run(b"speed", OPTIONS) == b"SPEED"
        assert await workers.run(b"pid", OPTIONS) == str(workers.pids[0]).encode()
        assert workers.pids[0] != os.getpid()
        assert await workers.run(b"threads", OPTIONS) == b"1"
        refused = await workers.run(b"refuse", Options(Ms=1.4))
        assert refused == Problem("refused-by-test", "The test asked for a refusal, and here it is.", {"Ms": 1.4})

    within(1, use)


def test_a_crash_costs_its_own_log_only() -> None:
    async def use(workers: Workers) -> None:
        died, lived = await asyncio.gather(workers.run(b"die", OPTIONS), workers.run(b"wait", OPTIONS))
        assert code(died) == "worker-lost"
        assert lived == b"WAIT"
        assert [await workers.run(b"a", OPTIONS) for _ in range(4)] == [b"A"] * 4
        assert workers.replaced == 1

    within(2, use)


def test_a_worker_that_dies_idle_costs_nothing() -> None:
    async def use(workers: Workers) -> None:
        before = workers.pids
        os.kill(before[0], signal.SIGKILL)
        assert gone(before[0])
        await asyncio.sleep(1.0)  # until the pool has noticed
        assert await workers.run(b"a", OPTIONS) == b"A"
        assert workers.pids != before

    within(1, use)


def test_the_time_limit_ends_the_process() -> None:
    async def use(workers: Workers) -> None:
        (hung,) = workers.pids
        begun = time.monotonic()
        answer = await workers.run(b"hang", OPTIONS)
        assert code(answer) == "time-limit"
        assert time.monotonic() - begun < 30
        assert await workers.run(b"a", OPTIONS) == b"A"
        assert hung not in workers.pids
        assert gone(hung)

    within(1, use, limit_s=3.0)


def test_a_cancelled_log_frees_its_lane() -> None:
    async def use(workers: Workers) -> None:
        waiting = asyncio.create_task(workers.run(b"hang", OPTIONS))
        await asyncio.sleep(0.3)
        waiting.cancel()
        with pytest.raises(asyncio.CancelledError):
            await waiting
        assert await workers.run(b"a", OPTIONS) == b"A"

    within(1, use)


def test_logs_beyond_the_queue_are_refused_before_they_are_received() -> None:
    workers = Workers(1, max_waiting=1, time_limit_s=1.0, task=obey)
    with workers.admit(), workers.admit():
        with pytest.raises(ProblemError) as refused, workers.admit():
            pass
        assert refused.value.problem.code == "busy"
    with workers.admit():
        assert workers.admitted == 1


def gone(pid: int, patience_s: float = 10.0) -> bool:
    """True once no process has this id."""
    end = time.monotonic() + patience_s
    while time.monotonic() < end:
        try:
            os.kill(pid, 0)
        except ProcessLookupError:
            return True
        time.sleep(0.05)
    return False
