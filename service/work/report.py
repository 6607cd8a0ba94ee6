"""One log to one report: the only road from bytes to numbers, for the command and for every route."""

from __future__ import annotations

import logging
from collections.abc import Callable
from pathlib import Path
from typing import TypeVar

from pydantic import TypeAdapter

import ident
from service.errors import Problem
from service.work.options import Options, limits_told, settings_told
from service.work.stages import enter
from service.work.units import with_units

T = TypeVar("T")

log = logging.getLogger("gainwright.work")

INTERNAL = Problem("internal", "The analysis failed by a fault of the program; its log says where.")

_report = TypeAdapter(ident.Report)


def report(source: bytes | Path, options: Options) -> ident.Report:
    """Read and analyse a log.

    Raises ident.IdentError where the log cannot be read or the request has no answer.
    """
    enter("reading")
    record = read(source, options)
    return ident.analyse(
        record,
        model=options.model,
        Ms=options.Ms,
        form=options.form,
        goal=options.goal,
        period=options.period,
        command_limits=(None, None) if options.command_limits is None else limits_told(options.command_limits),
        installed=None if options.installed is None else ident.PidSettings(*settings_told(options.installed)),
        on_stage=enter,
    )


def read(source: bytes | Path, options: Options) -> ident.LoopRecord:
    """A log as its options say. Raises ident.IdentError."""
    record = ident.read_csv(
        source,
        columns=options.columns,
        zone=options.zone,
        date_order=options.date_order,
        start=options.start,
        counts_per_rev=options.counts_per_rev,
    )
    return with_units(record, options.speed_unit, options.command_unit)


def to_json(report: ident.Report) -> bytes:
    """The report's JSON, the bytes that are sent, printed and stored; NaN and infinity become null."""
    return _report.dump_json(report)


def report_bytes(source: bytes | Path, options: Options) -> bytes | Problem:
    """The JSON of a log's report, or the problem that stands in its way. Never raises.

    It runs in worker processes, where an exception on its way back can break the pool, and SystemExit would
    be raised again in the service.
    """
    return told(lambda: to_json(report(source, options)))


def report_summary(source: bytes | Path, options: Options) -> str | Problem:
    """A log's report as text to read, or the problem that stands in its way. Never raises."""
    return told(lambda: ident.summary(report(source, options)))


def told(answer: Callable[[], T]) -> T | Problem:
    """The answer, or the problem that stands in its way. Never raises."""
    try:
        return answer()
    except ident.IdentError as error:
        return Problem(error.code, error.message, dict(error.evidence))
    except KeyboardInterrupt:
        raise  # only the command gets one: workers ignore the signal
    except BaseException:
        log.exception("an analysis failed")
        return INTERNAL
