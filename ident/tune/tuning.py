"""Tuning: one proposal with the margins it really has, and `tune`, which makes it for a robustness target."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

from ident.errors import Refused
from ident.findings import Finding
from ident.loop import Margins, PidSettings, margins
from ident.loop.held_plant import held_plant
from ident.tune.band import find_band
from ident.tune.ellipses import Limits
from ident.tune.largest_ki import largest_ki
from ident.tune.largest_ki_pid import largest_ki_pid
from ident.tune.least_iae import least_iae
from ident.tune.predict import Rehearsal, lagged
from ident.tune.predicted import Predicted
from ident.tune.setpoint_weight import weight_of

FORMS = ("pi", "pid")
GOALS = ("integral", "load", "setpoint")
METHODS = {"integral": "largest-ki", "load": "least-iae-load", "setpoint": "least-iae-setpoint"}
LOOSEST = 5.0  # beyond, a loop is so close to unstable that no target means anything


@dataclass(frozen=True, slots=True)
class Tuning:
    """One proposal.

    method     largest-ki | least-iae-load | least-iae-setpoint | simc
    form       pi | pid
    margins    of the loop with half the controller's period and the computing delay in it
    predicted  None where the plant is not one that is simulated
    because    one sentence: what makes these settings
    """

    method: str
    form: str
    settings: PidSettings
    margins: Margins
    predicted: Predicted | None
    findings: tuple[Finding, ...]
    because: str


def tune(
    plant: Any,
    *,
    Ms: float = 1.6,
    form: str = "pi",
    goal: str = "integral",
    period: float = 0.0,
    compute_delay: float = 0.0,
) -> Tuning:
    """Settings that are best for a goal while the loop is stable and max(Ms, Mt) stays at the target.

    plant          a fit, a model, or anything with frequency_response(w), taken to be stable, gain of any sign
    Ms             target, 1 to 5; sensible 1.2 (calm) to 2 (sharp)
    goal           integral: the largest ki; load, setpoint: the least IAE after a unit step of either
    period         controller sample time, s, 0 for analogue: half of it is dead time;  compute_delay  s
    For a plant of one or two lags the setpoint weight is chosen and both step responses are predicted; else b is 1.
    Raises Refused: target-out-of-range, unbounded, not-offered, no-settings-found, not-simulated (load, setpoint: a
    response too long to follow) and those of `margins`.
    """
    check_request(Ms, form, goal)
    held = held_plant(plant, period, compute_delay)
    band, limits = find_band(held, form), Limits(Ms)
    settings = (largest_ki if form == "pi" else largest_ki_pid)(band, limits)
    if goal != "integral":
        settings = least_iae(band, limits, goal, settings)
    timing = {"period": period, "compute_delay": compute_delay}
    found = margins(held.plant, settings, **timing)
    settings, predicted, findings = rehearse(plant, settings, period, compute_delay)
    because = {
        "integral": f"The largest integral gain, {settings.ki:.4g}, with Ms and Mt at most {Ms:g}.",
        "load": f"The least integrated absolute error after a load step, with Ms and Mt at most {Ms:g}.",
        "setpoint": f"The least integrated absolute error after a setpoint step, with Ms and Mt at most {Ms:g}.",
    }[goal]
    return Tuning(METHODS[goal], form, settings, found, predicted, findings, because)


def rehearse(
    plant: Any, settings: PidSettings, period: float, compute_delay: float
) -> tuple[PidSettings, Predicted | None, tuple[Finding, ...]]:
    """Setpoint weight, at most the one given, and predicted steps of a stable loop; none for a plant not simulated."""
    model = lagged(plant)
    if model is None:
        return settings, None, ()
    try:
        rehearsal = Rehearsal(model, settings, period, compute_delay)
        rehearsal.check()
        b, advice = weight_of(rehearsal)
        b = min(b, settings.b)
    except Refused as error:
        return settings, None, (Finding(error.code, "error", error.message),)
    return replace(settings, b=b), rehearsal.predicted(b), (advice,) if advice else ()


def check_request(Ms: float, form: str, goal: str) -> None:
    """Refuse a target, form or goal that has no answer here."""
    if not 1.0 < Ms <= LOOSEST:
        raise Refused(
            "target-out-of-range",
            f"Ms must be above 1 and at most {LOOSEST:g}; 1.2 (calm) to 2 (sharp) is sensible. Got {Ms:g}.",
        )
    if form not in FORMS or goal not in GOALS:
        raise Refused(
            "not-offered", f"form is one of {', '.join(FORMS)}; goal one of {', '.join(GOALS)}; got {form}, {goal}."
        )
