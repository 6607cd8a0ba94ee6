"""Tables, as the migrations leave them (a test holds that the two agree).

loops ──< logs ──< analyses ──1 reports
  └────< baselines >───────────────┘

Ids come from what they name (see `ids`), so the same log gets the same ids in any order and after any restart.
`number` counts in order of arrival. JSON is kept as text: it is written and read whole, never queried.
"""

from __future__ import annotations

from sqlalchemy import (
    BigInteger,
    CheckConstraint,
    Column,
    Float,
    ForeignKey,
    Index,
    Integer,
    LargeBinary,
    MetaData,
    String,
    Table,
    Text,
)

from service.store.times import UtcTime

metadata = MetaData(
    naming_convention={
        "ix": "ix_%(column_0_label)s",
        "uq": "uq_%(table_name)s_%(column_0_name)s",
        "ck": "ck_%(table_name)s_%(constraint_name)s",
        "fk": "fk_%(table_name)s_%(column_0_name)s",
        "pk": "pk_%(table_name)s",
    }
)

# Only INTEGER counts by itself in SQLite.
Counting = BigInteger().with_variant(Integer(), "sqlite")

loops = Table(
    "loops",
    metadata,
    Column("name", String(100), primary_key=True),
    Column("settings", Text, nullable=False),
    Column("created", UtcTime, nullable=False),
)

logs = Table(
    "logs",
    metadata,
    Column("number", Counting, primary_key=True, autoincrement=True),
    Column("id", String(40), nullable=False, unique=True),
    Column("loop", String(100), ForeignKey("loops.name"), nullable=False),
    Column("sha256", String(64), nullable=False),
    Column("size_bytes", BigInteger, nullable=False),
    Column("received", UtcTime, nullable=False),
    Index("ix_logs_loop_number", "loop", "number"),
)

analyses = Table(
    "analyses",
    metadata,
    Column("number", Counting, primary_key=True, autoincrement=True),
    Column("id", String(40), nullable=False, unique=True),
    Column("log_id", String(40), ForeignKey("logs.id"), nullable=False, index=True),
    Column("options", Text, nullable=False),
    Column("status", String(10), nullable=False),
    Column("stage", String(20), nullable=False),
    Column("progress", Float, nullable=False),
    Column("created", UtcTime, nullable=False),
    Column("finished", UtcTime),
    Column("problem", Text),
    # The lease: whose it is while it runs, which attempt that is, and until when others leave it alone.
    Column("owner", String(40)),
    Column("attempts", Integer, nullable=False),
    Column("leased_until", UtcTime),
    CheckConstraint("status IN ('queued', 'running', 'done', 'failed')", name="status"),
    Index("ix_analyses_status_number", "status", "number"),
)

reports = Table(
    "reports",
    metadata,
    Column("number", Counting, primary_key=True, autoincrement=True),
    Column("id", String(40), nullable=False, unique=True),
    Column("analysis_id", String(40), ForeignKey("analyses.id"), nullable=False, unique=True),
    Column("loop", String(100), ForeignKey("loops.name"), nullable=False),
    # Where the log stands among the loop's: its own time, or that of its receipt where it has none.
    Column("place", UtcTime, nullable=False),
    Column("start", UtcTime),
    Column("sha256", String(64), nullable=False),
    Column("numbers", Text, nullable=False),
    Column("body", LargeBinary, nullable=False),  # the report's JSON, zstd
    Column("created", UtcTime, nullable=False),
    Index("ix_reports_loop_place", "loop", "place", "sha256", "number"),
)

baselines = Table(
    "baselines",
    metadata,
    Column("loop", String(100), ForeignKey("loops.name"), primary_key=True),
    Column("report_id", String(40), ForeignKey("reports.id"), primary_key=True),
)
