"""Retune: other proposals from a report that was kept, without fitting again."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from pydantic import TypeAdapter

import ident
from service.errors import Problem
from service.work.kept_plant import plant_of
from service.work.numbers import numbers_of, parse
from service.work.options import Options
from service.work.report import told


@dataclass(frozen=True, slots=True)
class Retuned:
    """Proposals for a kept fit, as in its report; options: what they were made for.

    worst_case of each is None: the plants that it is taken over are drawn while the log is at hand.
    """

    options: dict[str, float | int | str | None]
    tunings: tuple[ident.TuningReport, ...]
    recommended: int | None
    recommended_because: str
    rules: tuple[ident.Rule, ...] = ()


INSTEAD_OF_MS = ("gain_margin", "phase_margin_deg", "closed_loop_s")
NOT_IN_REPORT = (*INSTEAD_OF_MS, "noise_peak", "command_noise_std", "overshoot_percent")
_retuned = TypeAdapter(Retuned)


def retuned_bytes(report: bytes, options: Options) -> bytes | Problem:
    """JSON of a Retuned for a report's JSON, or the problem that stands in its way. Never raises.

    What the options leave open is as in the report; those of reading and fitting do not count.
    """
    return told(lambda: _retuned.dump_json(_retune(report, options)))


class Retarget(Options):
    """Options of another proposal: targets other than Ms besides."""

    gain_margin: float | None = None
    phase_margin_deg: float | None = None
    closed_loop_s: float | None = None
    noise_peak: float | None = None
    command_noise_std: float | None = None
    overshoot_percent: float | None = None


def _retune(report: bytes, given: Options) -> Retuned:
    parsed = parse(report)
    plant = plant_of(parsed)
    before = parsed["options"]
    asked = {
        name: getattr(given, name) if name in given.model_fields_set else before[name]
        for name in ("Ms", "form", "goal", "period")
    }
    period = numbers_of(parsed).period_s if asked["period"] is None else asked["period"]
    delay = before["compute_delay"]
    more: dict[str, Any] = {name: value for name in NOT_IN_REPORT if (value := getattr(given, name, None)) is not None}
    if "Ms" not in given.model_fields_set and any(name in more for name in INSTEAD_OF_MS):
        asked["Ms"] = None
    noise: dict[str, Any] = {"speed_noise_std": noise_seen(parsed)} if "command_noise_std" in more else {}
    found = ident.propose(
        plant,
        Ms=asked["Ms"],
        form=asked["form"],
        goal=asked["goal"],
        period=period or 0.0,
        compute_delay=delay,
        **more,
        **noise,
    )
    tunings = tuple(
        ident.TuningReport(t.method, t.form, t.settings, t.margins, None, t.predicted, {}, t.findings)
        for t in found.tunings
    )
    options = {**asked, **more, **noise, "compute_delay": delay}
    return Retuned(options, tunings, found.recommended, found.because, found.rules)


def noise_seen(report: Mapping[str, Any]) -> float:
    """std of the noise of the measured speed: what the fit leaves, which holds the encoder's quantisation too."""
    return float(report["fits"][report["selected"]]["statistics"]["rms_residual"])
