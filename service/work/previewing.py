"""What a log is understood as, for a person to confirm, before anything is fitted."""

from __future__ import annotations

from pathlib import Path

from pydantic import TypeAdapter

import ident
from service.errors import Problem
from service.work.options import Options
from service.work.report import read, told
from service.work.stages import enter

_preview = TypeAdapter(ident.Preview)


def preview_bytes(source: bytes | Path, options: Options) -> bytes | Problem:
    """JSON of an `ident.Preview`, or the problem that stands in its way. Never raises."""
    return told(lambda: _preview.dump_json(_previewed(source, options)))


def _previewed(source: bytes | Path, options: Options) -> ident.Preview:
    enter("reading")
    return ident.previewed(read(source, options))
