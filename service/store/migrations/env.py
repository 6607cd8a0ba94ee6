"""How Alembic runs the migrations: on the connection that it is given, in its transaction."""

from __future__ import annotations

from alembic import context

from service.store.tables import metadata

connection = context.config.attributes["connection"]
context.configure(connection=connection, target_metadata=metadata, render_as_batch=True, compare_type=True)
context.run_migrations()
