"""Insert a row unless it is there: the one statement that each database spells from its own module."""

from __future__ import annotations

from typing import Any

from sqlalchemy import Connection, Table
from sqlalchemy.dialects import postgresql, sqlite


def insert_once(connection: Connection, table: Table, **values: Any) -> bool:
    """Whether the row is new; where a unique key is taken already, nothing changes."""
    insert = sqlite.insert if connection.dialect.name == "sqlite" else postgresql.insert
    put = insert(table).values(values).on_conflict_do_nothing()
    # The row itself says whether it went in: a count of rows is not given by every driver.
    return connection.execute(put.returning(*table.primary_key)).first() is not None
