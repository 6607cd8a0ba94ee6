"""Units of speed: which name the same thing, and what is to be said where two meet in one log."""

from __future__ import annotations

import math

from ident.findings import Finding
from ident.record.segments import Floats

_RPM = {
    **dict.fromkeys(("rpm", "1/min", "min-1", "u/min", "tr/min", "g/min", "giri/min"), 1.0),
    **dict.fromkeys(("rps", "rev/s", "turns/s", "hz"), 60.0),
    "rad/s": 30.0 / math.pi,
    **dict.fromkeys(("deg/s", "°/s"), 1.0 / 6.0),
}


def in_speed_unit(setpoint: Floats, unit: str, speed_unit: str) -> tuple[Floats, list[Finding]]:
    """The setpoint in the unit of the speed, where both are known; a finding where they differ."""
    mine, other = (_RPM.get(u.casefold()) for u in (unit, speed_unit))
    if unit.casefold() == speed_unit.casefold() or not unit or not speed_unit or (mine and mine == other):
        return setpoint, []
    evidence: dict[str, float | int | str | bool | None] = {"setpoint_unit": unit, "speed_unit": speed_unit}
    if mine and other:
        message = f"The setpoint is logged in {unit} and the speed in {speed_unit}: the setpoint was converted."
        return setpoint * (mine / other), [Finding("units-converted", "info", message, evidence)]
    message = f"The setpoint is in {unit} and the speed in {speed_unit}: they are not compared before one is converted."
    return setpoint, [Finding("units-differ", "warning", message, evidence)]


def cell_units(units: dict[str, dict[str, int]]) -> list[Finding]:
    """What was said of units inside cells.

    units   {role: {unit: cells}}
    """
    found = []
    plain = {role: next(iter(n)) for role, n in units.items() if len(n) == 1}
    if plain:
        listed = ", ".join(f"{unit} for {role}" for role, unit in plain.items())
        message = f"Units stood inside the cells and were taken off: {listed}."
        evidence: dict[str, float | int | str | bool | None] = {f"unit: {role}": unit for role, unit in plain.items()}
        found.append(Finding("units-in-cells", "info", message, evidence))
    for role, counts in units.items():
        if len(counts) > 1:
            shown = ", ".join(f"{unit} ({count})" for unit, count in counts.items())
            message = f"The cells of {role} carry different units: {shown}. They were not converted: export one unit."
            found.append(Finding("mixed-units", "error", message, {"role": role, "units": len(counts)}))
    return found
