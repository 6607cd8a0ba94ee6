"""What the report says of the log and the record made from it."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from ident.judge import Advice, Excitation, Operated, operation
from ident.record import LoopRecord
from ident.report.shape import LogInfo, RecordInfo, Span


def log_info(record: LoopRecord) -> LogInfo:
    """The log as it was read; a record made from arrays has no hash and no headers."""
    source = record.source
    duration = float(record.time[-1] - record.time[0])
    return LogInfo(
        sha256=source.sha256 if source else None,
        rows=source.rows if source else record.rows,
        start=_rfc3339(record.start) if record.start else None,
        end=_rfc3339(record.start + timedelta(seconds=duration)) if record.start else None,
        duration_s=duration,
        sample_time_s=record.sample_time,
        speed_unit=record.speed_unit,
        command_unit=record.command_unit,
        columns=dict(source.columns) if source else {},
        findings=source.findings if source else (),
    )


def record_info(
    record: LoopRecord, moved: Excitation, advice: Advice | None, operated: tuple[Operated, ...]
) -> RecordInfo:
    """Segments, spans left out, kind of operation and whether there is enough to learn from."""
    return RecordInfo(
        operation=operation(operated),
        excitation=moved,
        advice=advice,
        segments=tuple(
            _span(record, s.start, s.stop, "uniform" if s.step is not None else "irregular") for s in record.segments
        ),
        operations=tuple(_span(record, s.start, s.stop, s.operation) for s in operated),
        excluded=tuple(_span(record, e.start, e.stop, e.reason) for e in record.excluded),
    )


def _span(record: LoopRecord, start: int, stop: int, note: str) -> Span:
    return Span(float(record.time[start]), float(record.time[stop - 1]), stop - start, note)


def _rfc3339(stamp: datetime) -> str:
    return stamp.astimezone(UTC).isoformat().replace("+00:00", "Z")
