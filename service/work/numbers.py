"""Numbers: the part of a report that history and drift need, taken from its JSON."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from pydantic import TypeAdapter

import ident

Units = tuple[str, str]  # of speed and command


@dataclass(frozen=True, slots=True)
class Movement:
    """Of the command: largest less smallest value, and changes from row to row that count as moves."""

    span: float
    moves: int
    unit: str


@dataclass(frozen=True, slots=True)
class Parameter:
    value: float
    std: float | None
    ci95: tuple[float | None, float | None]
    unit: str


@dataclass(frozen=True, slots=True)
class Plant:
    """K, T, L of the first-order fit with their covariance, in the order of `names`.

    input_correlation_p   says whether that fit leaves dynamics out, which makes nights differ by more than noise
    rubbing               dry friction was fitted
    """

    values: dict[str, float]
    names: tuple[str, ...]
    matrix: tuple[tuple[float | None, ...], ...]
    gain_unit: str
    input_correlation_p: float | None = None
    rubbing: bool = False


@dataclass(frozen=True, slots=True)
class Recovered:
    """The controller that a log shows: Kp, Ti, Td, Tf, b, and how long after a logged speed it answers, s."""

    settings: dict[str, float]
    late_s: float


@dataclass(frozen=True, slots=True)
class Numbers:
    """Of one report; None and {} where the log carried no model.

    plant        whichever model was chosen, for nights are compared by K, T and L
    first_order  the same as estimates, K, T and L; parameters: of the chosen model
    recovered    None where the log shows no controller, or one that filters otherwise than our settings can say
    period_s     what the report's margins were reckoned with
    """

    sufficient: bool
    reason: str
    movement: Movement
    duration_s: float
    period_s: float | None
    model: str | None
    parameters: dict[str, Parameter]
    derived: dict[str, Parameter]
    fit_percent: float | None
    rms_residual: float | None
    speed_unit: str
    plant: Plant | None
    proposed: dict[str, float] | None
    first_order: dict[str, Parameter] = field(default_factory=dict)
    recovered: Recovered | None = None

    @property
    def units(self) -> Units:
        return self.speed_unit, self.movement.unit

    @property
    def model_of_plant(self) -> ident.Fopdt | None:
        if self.plant is None:
            return None
        return ident.Fopdt(*(self.plant.values[name] for name in ("K", "T", "L")))


_numbers = TypeAdapter(Numbers)


def start_of(report: Mapping[str, Any]) -> datetime | None:
    """The log's own time."""
    start = report["log"]["start"]
    return None if start is None else datetime.fromisoformat(start)


def numbers_of(report: Mapping[str, Any]) -> Numbers:
    """Of a report's JSON, parsed."""
    log, moved = report["log"], report["record"]["excitation"]
    fits, selected, best = report["fits"], report["selected"], report["recommended"]
    fit = fits[selected] if selected is not None else None
    first = next((f for f in fits if f["model"] == "fopdt"), None)
    return Numbers(
        sufficient=moved["sufficient"],
        reason=moved["reason"],
        movement=Movement(moved["command_span"], moved["command_moves"], log["command_unit"]),
        duration_s=log["duration_s"],
        period_s=_period(report),
        model=fit["model"] if fit else None,
        parameters=_parameters(fit["parameters"]) if fit else {},
        derived=_parameters(fit["derived"]) if fit else {},
        fit_percent=fit["statistics"]["fit_percent"] if fit else None,
        rms_residual=fit["statistics"]["rms_residual"] if fit else None,
        speed_unit=log["speed_unit"],
        plant=_plant(first) if first else None,
        proposed=report["tunings"][best]["settings"] if best is not None else None,
        first_order=_parameters(first["parameters"]) if first else {},
        recovered=_recovered(report["installed"]),
    )


def write_numbers(numbers: Numbers) -> str:
    return _numbers.dump_json(numbers).decode()


def read_numbers(text: str) -> Numbers:
    return _numbers.validate_json(text)


def parse(report: bytes) -> dict[str, Any]:
    parsed: dict[str, Any] = json.loads(report)
    return parsed


def _period(report: Mapping[str, Any]) -> float | None:
    """What was asked for, or what was taken for it."""
    assumed = [f["evidence"]["period_s"] for f in report["findings"] if f["code"] in ("period-assumed", "period-seen")]
    period: float | None = assumed[0] if assumed else report["options"]["period"]
    return period


def _parameters(told: Mapping[str, Any]) -> dict[str, Parameter]:
    return {
        name: Parameter(one["value"], one["std"], (one["ci95"][0], one["ci95"][1]), one["unit"])
        for name, one in told.items()
    }


def _recovered(installed: Mapping[str, Any] | None) -> Recovered | None:
    if installed is None or installed["source"] != "log":
        return None
    if installed["settings"]["Tf"] > 0.0 and installed["filter_on"] != "speed, second order":
        return None
    return Recovered(installed["settings"], installed["late_s"] or 0.0)


def _plant(fit: Mapping[str, Any]) -> Plant:
    parameters, covariance = fit["parameters"], fit["covariance"]
    return Plant(
        {name: one["value"] for name, one in parameters.items()},
        tuple(covariance["names"]),
        tuple(tuple(row) for row in covariance["matrix"]),
        parameters["K"]["unit"],
        fit["statistics"]["input_correlation_p"],
        fit.get("friction") is not None,
    )
