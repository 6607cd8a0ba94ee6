"""Jobs: an analysis on its way, held by whoever works on it under a lease.

queued --claim--> running --finish--> done | failed
   ^--release, reclaim--'

Whoever has lost its lease cannot write any more: every write names the owner and the attempt it was made for.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import Any

import zstandard
from sqlalchemy import ColumnElement, and_, or_, select, true, update

from service.errors import Problem
from service.store import ids, tables
from service.store.database import Database
from service.store.insert import insert_once
from service.store.problems import write_problem

MOST_ATTEMPTS = 3

analyses = tables.analyses
own = analyses.c


@dataclass(frozen=True, slots=True)
class Job:
    """An analysis that is this owner's to do, for this attempt."""

    id: str
    loop: str
    sha256: str
    options: str
    received: datetime
    owner: str
    attempt: int


@dataclass(frozen=True, slots=True)
class Result:
    """A report to keep: its JSON, the log's own time (None: it has none), and JSON text of what history needs."""

    body: bytes
    start: datetime | None
    numbers: str


class Jobs:
    def __init__(self, database: Database) -> None:
        self._database = database

    def claim(self, owner: str, stage: str, now: datetime, lease: timedelta) -> Job | None:
        """The job that has waited longest, now this owner's; None where nothing waits."""
        first = (
            select(own.number)
            .where(own.status == "queued")
            .order_by(own.number)
            .limit(1)
            .with_for_update(skip_locked=True)
            .scalar_subquery()
        )
        taken = (
            update(analyses)
            .where(own.number == first)
            .values(
                status="running",
                stage=stage,
                progress=0.0,
                owner=owner,
                attempts=own.attempts + 1,
                leased_until=now + lease,
            )
            .returning(own.id, own.log_id, own.options, own.attempts)
        )
        with self._database.write() as connection:
            row = connection.execute(taken).first()
            if row is None:
                return None
            log = connection.execute(select(tables.logs).where(tables.logs.c.id == row.log_id)).one()
            return Job(row.id, log.loop, log.sha256, row.options, log.received, owner, row.attempts)

    def renew(self, job: Job, stage: str, progress: float, now: datetime, lease: timedelta) -> bool:
        """Say how far a job is and keep its lease; False where it is not this owner's any more."""
        return self._set(job, stage=stage, progress=progress, leased_until=now + lease)

    def finish(self, job: Job, result: Result | Problem, now: datetime) -> bool:
        """Write a job's end; False, and nothing written, where it is not this owner's any more."""
        if isinstance(result, Problem):
            return self._set(job, problem=write_problem(result), **_ended("failed", now))
        with self._database.write() as connection:
            if connection.execute(update(analyses).where(_held(job)).values(_ended("done", now))).rowcount != 1:
                return False
            insert_once(
                connection,
                tables.reports,
                id=ids.report_id(job.id),
                analysis_id=job.id,
                loop=job.loop,
                place=result.start or job.received,
                start=result.start,
                sha256=job.sha256,
                numbers=result.numbers,
                body=zstandard.ZstdCompressor(write_checksum=True).compress(result.body),
                created=now,
            )
            return True

    def release(self, owner: str) -> int:
        """Put all jobs of an owner back that stops in order; the attempts do not count."""
        with self._database.write() as connection:
            back = update(analyses).where(own.status == "running", own.owner == owner)
            return connection.execute(back.values(attempts=own.attempts - 1, **QUEUED_AGAIN)).rowcount

    def lost(self, job: Job, problem: Problem, now: datetime) -> bool:
        """Put a job back whose process died, or end it with `problem` where that was the last attempt."""
        if job.attempt >= MOST_ATTEMPTS:
            return self.finish(job, problem, now)
        return self._set(job, **QUEUED_AGAIN)

    def reclaim(self, problem: Problem, now: datetime, *, everybody: bool) -> int:
        """Put the jobs back whose lease has run out, or end them with `problem` after their last attempt.

        everybody   whether nobody else can be at work, so that every running job was left behind
        The answer is how many there were.
        """
        left = and_(
            own.status == "running",
            true() if everybody else or_(own.leased_until.is_(None), own.leased_until < now),
        )
        spent = own.attempts >= MOST_ATTEMPTS
        ended = {"problem": write_problem(problem), **_ended("failed", now)}
        with self._database.write() as connection:
            failed = connection.execute(update(analyses).where(left, spent).values(ended)).rowcount
            return failed + connection.execute(update(analyses).where(left).values(QUEUED_AGAIN)).rowcount

    def _set(self, job: Job, **values: Any) -> bool:
        with self._database.write() as connection:
            return connection.execute(update(analyses).where(_held(job)).values(values)).rowcount == 1


QUEUED_AGAIN: dict[str, Any] = {
    "status": "queued",
    "stage": "queued",
    "progress": 0.0,
    "owner": None,
    "leased_until": None,
}


def _held(job: Job) -> ColumnElement[bool]:
    return and_(own.id == job.id, own.status == "running", own.owner == job.owner, own.attempts == job.attempt)


def _ended(status: str, now: datetime) -> dict[str, Any]:
    return {
        "status": status, "stage": status, "progress": 1.0, "finished": now, "owner": None, "leased_until": None,
    }  # fmt: skip
