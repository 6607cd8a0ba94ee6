"""Logs as they arrived, and what was asked of each: an analysis per log and set of options."""

from __future__ import annotations

from collections.abc import Container
from dataclasses import dataclass
from datetime import datetime
from typing import Any, Literal

from sqlalchemy import Connection, Row, Select, select, update

from service.errors import Problem
from service.store import ids, tables
from service.store.database import Database
from service.store.insert import insert_once
from service.store.problems import read_problem

Status = Literal["queued", "running", "done", "failed"]


@dataclass(frozen=True, slots=True)
class KeptLog:
    """number: in order of arrival."""

    number: int
    id: str
    loop: str
    sha256: str
    size_bytes: int
    received: datetime


@dataclass(frozen=True, slots=True)
class Analysis:
    """options: JSON text, only what differs from the defaults;  progress: 0 to 1;  report_id: once done."""

    id: str
    loop: str
    log_id: str
    options: str
    status: Status
    stage: str
    progress: float
    report_id: str | None
    problem: Problem | None
    created: datetime
    finished: datetime | None


@dataclass(frozen=True, slots=True)
class Accepted:
    """An analysis, and whether it is a new one."""

    analysis: Analysis
    new: bool


class Logs:
    def __init__(self, database: Database) -> None:
        self._database = database

    def accept(
        self,
        loop: str,
        sha256: str,
        size_bytes: int,
        options: str,
        now: datetime,
        *,
        loop_settings: str,
        try_again: Container[str] = (),
    ) -> Accepted:
        """Keep a log whose bytes are kept already, and queue its analysis; what is there already stays as it is.

        loop_settings  of a loop that is new
        try_again      codes of problems that lie with the service: an analysis that failed so is queued again
        """
        log = ids.log_id(loop, sha256)
        analysis = ids.analysis_id(log, options)
        with self._database.write() as connection:
            insert_once(connection, tables.loops, name=loop, settings=loop_settings, created=now)
            insert_once(connection, tables.logs, id=log, loop=loop, sha256=sha256, size_bytes=size_bytes, received=now)
            new = insert_once(
                connection, tables.analyses, id=analysis, log_id=log, options=options, created=now, **QUEUED
            )
            found = _analysis(connection, analysis)
            assert found is not None
            if found.problem is not None and found.problem.code in try_again:
                again = update(tables.analyses).where(tables.analyses.c.id == analysis)
                connection.execute(again.values(problem=None, finished=None, **QUEUED))
                found = _analysis(connection, analysis)
                assert found is not None
            return Accepted(found, new)

    def analysis(self, id: str) -> Analysis | None:
        with self._database.read() as connection:
            return _analysis(connection, id)

    def get(self, id: str) -> KeptLog | None:
        with self._database.read() as connection:
            row = connection.execute(select(tables.logs).where(tables.logs.c.id == id)).first()
            return None if row is None else KeptLog(*row)

    def page(self, loop: str, after: int, limit: int) -> list[tuple[KeptLog, tuple[Analysis, ...]]]:
        """At most `limit` logs of a loop with numbers above `after`, in order of arrival, each with its analyses."""
        own = tables.logs.c
        wanted = select(tables.logs).where(own.loop == loop, own.number > after).order_by(own.number).limit(limit)
        with self._database.read() as connection:
            logs = [KeptLog(*row) for row in connection.execute(wanted)]
            asked: dict[str, list[Analysis]] = {log.id: [] for log in logs}
            theirs = _analyses().where(tables.analyses.c.log_id.in_(asked)).order_by(tables.analyses.c.number)
            for row in connection.execute(theirs):
                asked[row.log_id].append(_value(row))
        return [(log, tuple(asked[log.id])) for log in logs]


QUEUED: dict[str, Any] = {
    "status": "queued",
    "stage": "queued",
    "progress": 0.0,
    "attempts": 0,
    "owner": None,
    "leased_until": None,
}


def _analyses() -> Select[Any]:
    own = tables.analyses.c
    return (
        select(
            own.id, tables.logs.c.loop, own.log_id, own.options, own.status, own.stage, own.progress,
            tables.reports.c.id.label("report_id"), own.problem, own.created, own.finished,
        )
        .join(tables.logs, tables.logs.c.id == own.log_id)
        .outerjoin(tables.reports, tables.reports.c.analysis_id == own.id)
    )  # fmt: skip


def _analysis(connection: Connection, id: str) -> Analysis | None:
    row = connection.execute(_analyses().where(tables.analyses.c.id == id)).first()
    return None if row is None else _value(row)


def _value(row: Row[Any]) -> Analysis:
    return Analysis(**{**row._mapping, "problem": read_problem(row.problem)})
