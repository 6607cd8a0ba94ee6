"""Database: the engine, what a transaction is, and the migrations on the way up.

Only the service's own process opens it; worker processes never do. In SQLite a writing transaction takes the write
lock when it begins: one that reads first and writes later fails at once with "database is locked", whatever the
time-out.
"""

from __future__ import annotations

import logging
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from alembic import command
from alembic.config import Config
from sqlalchemy import Connection, Engine, create_engine, event, make_url
from sqlalchemy.exc import ArgumentError

from service.errors import ProblemError

log = logging.getLogger("gainwright.store")

MIGRATIONS = Path(__file__).resolve().parent / "migrations"
BUSY_TIMEOUT_S = 30.0
WRITES = "gainwright_writes"


class Database:
    """One database with the newest tables."""

    def __init__(self, url: str) -> None:
        """Raises ProblemError: bad-database-url."""
        self.engine = engine(url)
        self._writing = self.engine.execution_options(**{WRITES: True})
        self.upgrade()

    def upgrade(self) -> None:
        """Bring the tables to the newest form; new ones are made the same way."""
        with self._writing.begin() as connection:
            command.upgrade(alembic_config(connection), "head")

    @contextmanager
    def read(self) -> Iterator[Connection]:
        """A transaction that sees one state of the data and changes nothing."""
        with self.engine.connect() as connection:
            yield connection

    @contextmanager
    def write(self) -> Iterator[Connection]:
        """A transaction that changes data, durable when this block has ended."""
        with self._writing.begin() as connection:
            yield connection

    def close(self) -> None:
        self.engine.dispose()


def engine(url: str) -> Engine:
    """Raises ProblemError: bad-database-url."""
    try:
        parsed = make_url(url)
    except ArgumentError:
        parsed = None
    if parsed is None or parsed.get_backend_name() not in ("sqlite", "postgresql"):
        raise ProblemError(
            "bad-database-url",
            "GAINWRIGHT_DATABASE_URL must begin with sqlite:/// or postgresql://; unset, an SQLite file in the data "
            "folder is used.",
        )
    if parsed.get_backend_name() != "sqlite":
        return create_engine(parsed, pool_pre_ping=True)
    made = create_engine(parsed, connect_args={"timeout": BUSY_TIMEOUT_S})
    event.listen(made, "connect", _prepare)
    event.listen(made, "begin", _begin)
    log.info("SQLite %s", sqlite3.sqlite_version)
    return made


def alembic_config(connection: Connection) -> Config:
    """Where the migrations are, and the connection they are to use."""
    config = Config(attributes={"connection": connection})
    config.set_main_option("script_location", str(MIGRATIONS).replace("%", "%%"))
    return config


def _prepare(connection: Any, _: object) -> None:
    connection.isolation_level = None  # transactions begin when `_begin` says so, not at the first write
    for setting in ("journal_mode=WAL", "synchronous=FULL", "foreign_keys=ON"):
        connection.execute(f"PRAGMA {setting}")


def _begin(connection: Connection) -> None:
    writes = connection.get_execution_options().get(WRITES, False)
    connection.exec_driver_sql("BEGIN IMMEDIATE" if writes else "BEGIN")
