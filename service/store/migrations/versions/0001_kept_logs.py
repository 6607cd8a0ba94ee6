"""Loops, logs, analyses, reports and baselines."""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

from service.store.times import UtcTime

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None


def _number() -> sa.Column[int]:
    kind = sa.BigInteger().with_variant(sa.Integer(), "sqlite")
    return sa.Column("number", kind, primary_key=True, autoincrement=True)


def upgrade() -> None:
    op.create_table(
        "loops",
        sa.Column("name", sa.String(100), nullable=False),
        sa.Column("settings", sa.Text, nullable=False),
        sa.Column("created", UtcTime, nullable=False),
        sa.PrimaryKeyConstraint("name", name="pk_loops"),
    )
    op.create_table(
        "logs",
        _number(),
        sa.Column("id", sa.String(40), nullable=False),
        sa.Column("loop", sa.String(100), nullable=False),
        sa.Column("sha256", sa.String(64), nullable=False),
        sa.Column("size_bytes", sa.BigInteger, nullable=False),
        sa.Column("received", UtcTime, nullable=False),
        sa.PrimaryKeyConstraint("number", name="pk_logs"),
        sa.UniqueConstraint("id", name="uq_logs_id"),
        sa.ForeignKeyConstraint(["loop"], ["loops.name"], name="fk_logs_loop"),
    )
    op.create_index("ix_logs_loop_number", "logs", ["loop", "number"])
    op.create_table(
        "analyses",
        _number(),
        sa.Column("id", sa.String(40), nullable=False),
        sa.Column("log_id", sa.String(40), nullable=False),
        sa.Column("options", sa.Text, nullable=False),
        sa.Column("status", sa.String(10), nullable=False),
        sa.Column("stage", sa.String(20), nullable=False),
        sa.Column("progress", sa.Float, nullable=False),
        sa.Column("created", UtcTime, nullable=False),
        sa.Column("finished", UtcTime),
        sa.Column("problem", sa.Text),
        sa.Column("owner", sa.String(40)),
        sa.Column("attempts", sa.Integer, nullable=False),
        sa.Column("leased_until", UtcTime),
        sa.PrimaryKeyConstraint("number", name="pk_analyses"),
        sa.UniqueConstraint("id", name="uq_analyses_id"),
        sa.ForeignKeyConstraint(["log_id"], ["logs.id"], name="fk_analyses_log_id"),
        sa.CheckConstraint("status IN ('queued', 'running', 'done', 'failed')", name=op.f("ck_analyses_status")),
    )
    op.create_index("ix_analyses_log_id", "analyses", ["log_id"])
    op.create_index("ix_analyses_status_number", "analyses", ["status", "number"])
    op.create_table(
        "reports",
        _number(),
        sa.Column("id", sa.String(40), nullable=False),
        sa.Column("analysis_id", sa.String(40), nullable=False),
        sa.Column("loop", sa.String(100), nullable=False),
        sa.Column("place", UtcTime, nullable=False),
        sa.Column("start", UtcTime),
        sa.Column("sha256", sa.String(64), nullable=False),
        sa.Column("numbers", sa.Text, nullable=False),
        sa.Column("body", sa.LargeBinary, nullable=False),
        sa.Column("created", UtcTime, nullable=False),
        sa.PrimaryKeyConstraint("number", name="pk_reports"),
        sa.UniqueConstraint("id", name="uq_reports_id"),
        sa.UniqueConstraint("analysis_id", name="uq_reports_analysis_id"),
        sa.ForeignKeyConstraint(["analysis_id"], ["analyses.id"], name="fk_reports_analysis_id"),
        sa.ForeignKeyConstraint(["loop"], ["loops.name"], name="fk_reports_loop"),
    )
    op.create_index("ix_reports_loop_place", "reports", ["loop", "place", "sha256", "number"])
    op.create_table(
        "baselines",
        sa.Column("loop", sa.String(100), nullable=False),
        sa.Column("report_id", sa.String(40), nullable=False),
        sa.PrimaryKeyConstraint("loop", "report_id", name="pk_baselines"),
        sa.ForeignKeyConstraint(["loop"], ["loops.name"], name="fk_baselines_loop"),
        sa.ForeignKeyConstraint(["report_id"], ["reports.id"], name="fk_baselines_report_id"),
    )


def downgrade() -> None:
    for table in ("baselines", "reports", "analyses", "logs", "loops"):
        op.drop_table(table)
