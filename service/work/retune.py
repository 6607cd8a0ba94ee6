"""Retune: other proposals from a report that was kept, without fitting again."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

from pydantic import TypeAdapter

import ident
from service.errors import Problem
from service.work.kept_plant import Plant, plant_of
from service.work.numbers import numbers_of, parse
from service.work.options import Options
from service.work.realising import Analogue, Digital, Realising
from service.work.report import told


@dataclass(frozen=True, slots=True)
class Retuned:
    """Proposals for a kept fit, as in its report; options: what they were made for."""

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
    """Options of another proposal: targets other than Ms besides, and how it is to be carried out."""

    gain_margin: float | None = None
    phase_margin_deg: float | None = None
    closed_loop_s: float | None = None
    noise_peak: float | None = None
    command_noise_std: float | None = None
    overshoot_percent: float | None = None
    realisation: Realising | None = None


def _retune(report: bytes, given: Options) -> Retuned:
    parsed = parse(report)
    plant = plant_of(parsed)
    before = parsed["options"]
    asked = {
        name: getattr(given, name) if name in given.model_fields_set else before[name]
        for name in ("Ms", "form", "goal", "period")
    }
    realisation = given.realisation if isinstance(given, Retarget) else None
    period = numbers_of(parsed).period_s if asked["period"] is None else asked["period"]
    delay = before["compute_delay"]
    if isinstance(realisation, Analogue):
        period = delay = 0.0  # of a card, whatever controller the log was taken with
    more: dict[str, Any] = {name: value for name in NOT_IN_REPORT if (value := getattr(given, name, None)) is not None}
    if "Ms" not in given.model_fields_set and any(name in more for name in INSTEAD_OF_MS):
        asked["Ms"] = None
    noise: dict[str, Any] = {"speed_noise_std": noise_seen(parsed)} if "command_noise_std" in more else {}
    cloud = ident.allowed_again(
        plant,
        parsed["fits"][parsed["selected"]].get("spread"),  # reports of before have none
        seed=before.get("seed", 0),
        period=period or 0.0,
        compute_delay=delay,
    )
    found = ident.propose(
        plant,
        Ms=asked["Ms"],
        form=asked["form"],
        goal=asked["goal"],
        period=period or 0.0,
        compute_delay=delay,
        allowed=cloud,
        robust=before.get("robust"),
        **more,
        **noise,
    )
    tunings = tuple(
        ident.TuningReport(
            t.method,
            t.form,
            t.settings,
            t.margins,
            cloud.worst_case(t.settings) if cloud and t.margins.stable else None,
            t.predicted,
            _realised(t, plant if i == found.recommended else None, realisation, asked, period or 0.0, delay),
            t.findings,
        )
        for i, t in enumerate(found.tunings)
    )
    options = {**asked, **more, **noise, "compute_delay": delay}
    return Retuned(options, tunings, found.recommended, found.because, found.rules)


def noise_seen(report: Mapping[str, Any]) -> float:
    """std of the noise of the measured speed: what the fit leaves, which holds the encoder's quantisation too."""
    return float(report["fits"][report["selected"]]["statistics"]["rms_residual"])


def _realised(
    tuning: ident.Tuning,
    plant: Plant | None,
    wanted: Digital | Analogue | None,
    asked: Mapping[str, Any],
    period: float,
    delay: float,
) -> ident.Realisations:
    """Of the recommended proposal (the one with a plant) as wanted; of the others their forms."""
    given = wanted.model_dump(exclude={"kind"}) if isinstance(wanted, Digital) else {}
    made = ident.realise(tuning.settings, plant, period=period, compute_delay=delay, **given)
    if plant is None or not isinstance(wanted, Analogue):
        return made
    if asked["Ms"] is None:
        raise ident.Refused("card-needs-ms", "Parts of a card are chosen for a target Ms: give Ms with it.")
    card = ident.choose_card(
        plant,
        Ms=asked["Ms"],
        form=asked["form"],
        scale=wanted.scale,
        limits=wanted.limits,
        leak=wanted.leak,
        Rl=wanted.Rl,
        R_tolerance=wanted.R_tolerance,
        C_tolerance=wanted.C_tolerance,
    )
    return replace(made, card=card)
