"""Reports: their JSON, byte for byte, and rows of what history needs.

History's order is the logs' own time. A log without one stands at the time of its receipt. Equal times are ordered
by the content of the log, so that the order of arrival does not matter; reports of one log by when they were asked.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

import zstandard
from sqlalchemy import Row, Select, select, tuple_

from service.store import tables
from service.store.database import Database

own = tables.reports.c
ORDER = (own.place, own.sha256, tables.analyses.c.number)


@dataclass(frozen=True, slots=True)
class KeptReport:
    """A report without its JSON.

    place     where its log stands in the history;  start  the log's own time, or None
    sha256    of the log;  numbers  JSON text
    """

    id: str
    analysis_id: str
    log_id: str
    loop: str
    place: datetime
    start: datetime | None
    sha256: str
    numbers: str
    asked: int


class Reports:
    def __init__(self, database: Database) -> None:
        self._database = database

    def get(self, id: str) -> KeptReport | None:
        with self._database.read() as connection:
            row = connection.execute(_reports().where(own.id == id)).first()
            return None if row is None else _value(row)

    def body(self, id: str) -> bytes | None:
        """The report's JSON, the bytes that were kept."""
        with self._database.read() as connection:
            packed = connection.scalar(select(own.body).where(own.id == id))
        return None if packed is None else zstandard.ZstdDecompressor().decompress(packed)

    def history(self, loop: str, after: KeptReport | None = None, limit: int | None = None) -> list[KeptReport]:
        """Reports of a loop in history's order, those behind `after` where one is given."""
        wanted = _reports().where(own.loop == loop).order_by(*ORDER).limit(limit)
        if after is not None:
            wanted = wanted.where(tuple_(*ORDER) > (after.place, after.sha256, after.asked))
        with self._database.read() as connection:
            return [_value(row) for row in connection.execute(wanted)]

    def of(self, report_ids: Sequence[str]) -> list[KeptReport]:
        """Those of the reports that exist, in history's order."""
        wanted = _reports().where(own.id.in_(report_ids)).order_by(*ORDER)
        with self._database.read() as connection:
            return [_value(row) for row in connection.execute(wanted)]


def _reports() -> Select[Any]:
    asked = tables.analyses.c
    return select(
        own.id, own.analysis_id, asked.log_id, own.loop, own.place, own.start, own.sha256, own.numbers,
        asked.number.label("asked"),
    ).join(tables.analyses, asked.id == own.analysis_id)  # fmt: skip


def _value(row: Row[Any]) -> KeptReport:
    return KeptReport(**row._mapping)
