"""Loops: what is known of each, and the reports that are its baseline."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, Row, Select, delete, func, insert, select, update

from service.store import tables
from service.store.database import Database
from service.store.insert import insert_once


@dataclass(frozen=True, slots=True)
class KeptLoop:
    """settings: JSON text, as it was put;  logs: how many are kept;  baseline: ids of reports, sorted."""

    name: str
    settings: str
    created: datetime
    logs: int
    baseline: tuple[str, ...]


class Loops:
    def __init__(self, database: Database) -> None:
        self._database = database

    def get(self, name: str) -> KeptLoop | None:
        with self._database.read() as connection:
            row = connection.execute(_loops().where(tables.loops.c.name == name)).first()
            return None if row is None else _with_baseline(connection, [row])[0]

    def page(self, after: str, limit: int) -> list[KeptLoop]:
        """At most `limit` loops whose names come after `after`, in order of name."""
        wanted = _loops().where(tables.loops.c.name > after).order_by(tables.loops.c.name).limit(limit)
        with self._database.read() as connection:
            return _with_baseline(connection, connection.execute(wanted).all())

    def put(self, name: str, settings: str, now: datetime) -> bool:
        """Replace a loop's settings; whether the loop is new."""
        with self._database.write() as connection:
            if insert_once(connection, tables.loops, name=name, settings=settings, created=now):
                return True
            connection.execute(update(tables.loops).where(tables.loops.c.name == name).values(settings=settings))
            return False

    def set_baseline(self, name: str, report_ids: Sequence[str]) -> None:
        """Replace a loop's baseline; the loop and the reports exist."""
        own = tables.baselines
        with self._database.write() as connection:
            connection.execute(delete(own).where(own.c.loop == name))
            if report_ids:
                connection.execute(insert(own), [{"loop": name, "report_id": report} for report in report_ids])


def _loops() -> Select[Any]:
    count = (
        select(func.count()).where(tables.logs.c.loop == tables.loops.c.name).correlate(tables.loops).scalar_subquery()
    )
    return select(tables.loops, count.label("logs"))


def _with_baseline(connection: Connection, rows: Sequence[Row[Any]]) -> list[KeptLoop]:
    own = tables.baselines.c
    found: dict[str, list[str]] = {row.name: [] for row in rows}
    wanted = select(own.loop, own.report_id).where(own.loop.in_(found)).order_by(own.report_id)
    for loop, report in connection.execute(wanted):
        found[loop].append(report)
    return [KeptLoop(row.name, row.settings, row.created, row.logs, tuple(found[row.name])) for row in rows]
