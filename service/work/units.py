"""Units that a log's own header leaves out."""

from __future__ import annotations

from dataclasses import replace

import ident


def with_units(record: ident.LoopRecord, speed_unit: str | None, command_unit: str | None) -> ident.LoopRecord:
    """The record with these units where its header has none; a header that says otherwise stands, with a finding."""
    given = {"speed_unit": speed_unit, "command_unit": command_unit}
    told = {name: unit for name, unit in given.items() if unit is not None}
    missing = {name: unit for name, unit in told.items() if not getattr(record, name)}
    if missing:
        record = replace(record, **missing)  # type: ignore[arg-type]
    differing = [name for name, unit in told.items() if getattr(record, name) != unit]
    if differing and record.source is not None:
        findings = tuple(_differs(name, told[name], getattr(record, name)) for name in differing)
        record = replace(record, source=replace(record.source, findings=(*record.source.findings, *findings)))
    return record


def _differs(name: str, given: str, header: str) -> ident.Finding:
    role = name.removesuffix("_unit")
    return ident.Finding(
        "unit-differs",
        "warning",
        f'The header gives the {role} in "{header}", "{given}" was asked for: the header was followed and no '
        "number converted. Correct whichever is wrong.",
        {"header": header, "given": given},
    )
