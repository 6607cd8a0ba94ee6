"""The options of read_csv, checked: what a caller says of a log that the log itself does not."""

from __future__ import annotations

import math
from dataclasses import dataclass
from datetime import UTC, datetime
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from ident.errors import ReadError
from ident.record.columns import Columns
from ident.record.quote import quoted
from ident.record.written import DATE_ORDERS

BLANKS = ("held", "missing")


@dataclass(frozen=True, slots=True)
class Options:
    """What the caller says; None where the log is to tell."""

    columns: Columns | None
    zone: ZoneInfo | None
    date_order: str | None
    start: datetime | None
    counts_per_rev: float | None
    blanks: str | None


def checked(
    columns: Columns | None,
    zone: str | None,
    date_order: str | None,
    start: datetime | str | None,
    counts_per_rev: float | None,
    blanks: str | None,
) -> Options:
    """The options as values.

    Raises ReadError bad-option.
    """
    if date_order is not None and date_order not in DATE_ORDERS:
        raise ReadError("bad-option", f"date_order is one of {', '.join(DATE_ORDERS)}; not {quoted(str(date_order))}.")
    if blanks is not None and blanks not in BLANKS:
        raise ReadError("bad-option", f"blanks is one of {', '.join(BLANKS)}; not {quoted(str(blanks))}.")
    if counts_per_rev is not None and not (math.isfinite(counts_per_rev) and counts_per_rev > 0):
        raise ReadError("bad-option", "counts_per_rev is a number above 0: the counts of one revolution.")
    place = _zone(zone)
    return Options(columns, place, date_order, _start(start, place), counts_per_rev, blanks)


def _zone(zone: str | None) -> ZoneInfo | None:
    if zone is None:
        return None
    try:
        return ZoneInfo(zone)
    except (ZoneInfoNotFoundError, ValueError, OSError) as cause:
        raise ReadError(
            "bad-option",
            f'There is no time zone {quoted(str(zone))}: give a name such as "Europe/Berlin" or "UTC".',
        ) from cause


def _start(start: datetime | str | None, zone: ZoneInfo | None) -> datetime | None:
    if start is None:
        return None
    try:
        begin = datetime.fromisoformat(start) if isinstance(start, str) else start
    except ValueError as cause:
        raise ReadError(
            "bad-option", f"start {quoted(str(start))} is no ISO 8601 time, such as 2026-03-02T08:15:00Z."
        ) from cause
    if begin.utcoffset() is None:
        if zone is None:
            raise ReadError("bad-option", "start needs an offset (2026-03-02T08:15:00Z), or give the zone too.")
        begin = begin.replace(tzinfo=zone)
    return begin.astimezone(UTC)
