"""Tuning: one proposal with the margins it really has, and `tune`, which makes it for a robustness target."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from ident.errors import Refused
from ident.findings import Finding
from ident.loop import Margins, PidSettings, margins
from ident.loop.held_plant import HeldPlant, held_plant
from ident.tune.band import Band, find_band
from ident.tune.ellipses import FILTER, Limits
from ident.tune.iae import find_iae
from ident.tune.largest_ki import largest_ki
from ident.tune.largest_ki_pid import largest_ki_pid
from ident.tune.least_iae import least_iae, logarithms
from ident.tune.predict import Rehearsal, lagged
from ident.tune.predicted import Predicted
from ident.tune.setpoint_weight import OVERSHOOT, weight_of
from ident.tune.target import Target, solve, target_of

FORMS = ("pi", "pid")
GOALS = ("integral", "load", "setpoint")
METHODS = {"integral": "largest-ki", "load": "least-iae-load", "setpoint": "least-iae-setpoint"}
LONGER = (4.0, 2.0, 1.0)  # Td/Tf tried where noise is limited


@dataclass(frozen=True, slots=True)
class Tuning:
    """One proposal.

    method     largest-ki | largest-ki-calm-derivative | least-iae-load | least-iae-setpoint |
               held-for-95-percent | simc
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
    Ms: float | None = None,
    form: str = "pi",
    goal: str = "integral",
    period: float = 0.0,
    compute_delay: float = 0.0,
    gain_margin: float | None = None,
    phase_margin_deg: float | None = None,
    closed_loop_s: float | None = None,
    noise_peak: float | None = None,
    command_noise_std: float | None = None,
    speed_noise_std: float | None = None,
    filter_ratio: float = FILTER,
    overshoot_percent: float = OVERSHOOT,
) -> Tuning:
    """Settings that are best for a goal while the loop is stable and max(Ms, Mt) stays at the target.

    plant          a fit, a model, or anything with frequency_response(w), taken to be stable, gain of any sign
    Ms             target, 1 to 5; sensible 1.2 (calm) to 2 (sharp); 1.6 unless another target is given
    gain_margin, phase_margin_deg, closed_loop_s, noise_peak, command_noise_std, speed_noise_std: see `Target`
    filter_ratio   Td/Tf; a limit on noise takes a smaller one where that serves the goal
    overshoot_percent  allowed after a setpoint step, by the choice of the setpoint weight
    goal           integral: the largest ki; load, setpoint: the least IAE after a unit step of either
    period         controller sample time, s, 0 for analogue: half of it is dead time;  compute_delay  s
    For a plant of one or two lags the setpoint weight is chosen and both step responses are predicted; else b is 1.
    Raises Refused: target-out-of-range, target-unreachable, unbounded, not-offered, no-settings-found, not-simulated
    (load, setpoint: a response too long to follow) and those of `margins`.
    """
    target = target_of(
        Ms,
        gain_margin=gain_margin,
        phase_margin_deg=phase_margin_deg,
        closed_loop_s=closed_loop_s,
        noise_peak=noise_peak,
        command_noise_std=command_noise_std,
        speed_noise_std=speed_noise_std,
    )
    return Asked(plant, target, form, goal, period, compute_delay, filter_ratio, overshoot_percent).best()


@dataclass(frozen=True, slots=True)
class Asked:
    """One request, as for `tune`: what every proposal for it shares. ratio  Td/Tf."""

    plant: Any
    target: Target
    form: str
    goal: str
    period: float
    compute_delay: float
    ratio: float
    overshoot_percent: float

    @property
    def held(self) -> HeldPlant:
        """The plant as the controller meets it."""
        return held_plant(self.plant, self.period, self.compute_delay)

    def best(self) -> Tuning:
        """The proposal that is best for the goal."""
        check_request(self.form, self.goal)
        settings, _ = optimum(self.held, self.target, self.form, self.goal, self.ratio)
        return self.tuning(METHODS[self.goal], settings, _because(self.goal, settings, self.target))

    def tuning(self, method: str, settings: PidSettings, because: str, form: str | None = None) -> Tuning:
        """A proposal of these settings: their margins, the setpoint weight and the predicted steps of a stable loop.

        form   None: the one asked for
        """
        found = margins(self.plant, settings, period=self.period, compute_delay=self.compute_delay)
        predicted: Predicted | None = None
        findings: tuple[Finding, ...] = ()
        if found.stable:
            settings, predicted, findings = rehearse(
                self.plant, settings, self.period, self.compute_delay, self.overshoot_percent
            )
        return Tuning(method, form or self.form, settings, found, predicted, findings, because)


def optimum(held: HeldPlant, target: Target, form: str, goal: str, ratio: float) -> tuple[PidSettings, Limits]:
    """The best settings for a goal under a target, and the limits on abs(S), abs(T) and abs(C F S) that they keep."""
    band = find_band(held, form, bounded=target.bounds)

    def best(limits: Limits) -> PidSettings:
        settings = (largest_ki if form == "pi" else largest_ki_pid)(band, limits)
        return settings if goal == "integral" else least_iae(band, limits, goal, settings)

    gain = float(abs(band.plant[0]))
    if form == "pi" or not target.bounds:
        return solve(target, held, gain, ratio, best)
    found = []
    # A limit on noise may be met best by a longer filter.
    ratios = [ratio, *(r for r in LONGER if r < ratio)]
    refused: Refused | None = None
    for one in ratios:
        try:
            settings, limits = solve(target, held, gain, one, best)
            found.append((_worth(band, settings, goal, one), settings, limits))
        except Refused as error:
            refused = error
    if not found:
        assert refused is not None
        raise refused
    _, settings, limits = max(found, key=lambda f: f[0])
    return settings, limits


def _worth(band: Band, settings: PidSettings, goal: str, ratio: float) -> float:
    """What a goal makes of settings, more is better."""
    if goal == "integral":
        return float(np.log(settings.ki))
    return -find_iae(band, settings, goal, ratio)(logarithms(settings))[0]


def _because(goal: str, settings: PidSettings, target: Target) -> str:
    what = {
        "integral": f"The largest integral gain, {settings.ki:.4g}",
        "load": "The least integrated absolute error after a load step",
        "setpoint": "The least integrated absolute error after a setpoint step",
    }[goal]
    return f"{what}, with {target.says}."


def rehearse(
    plant: Any,
    settings: PidSettings,
    period: float,
    compute_delay: float,
    overshoot_percent: float = OVERSHOOT,
) -> tuple[PidSettings, Predicted | None, tuple[Finding, ...]]:
    """Setpoint weight, at most the one given, and predicted steps of a stable loop; none for a plant not simulated."""
    model = lagged(plant)
    if model is None:
        return settings, None, ()
    try:
        rehearsal = Rehearsal(model, settings, period, compute_delay)
        rehearsal.check()
        b, advice = weight_of(rehearsal, overshoot_percent)
        b = min(b, settings.b)
    except Refused as error:
        return settings, None, (Finding(error.code, "error", error.message),)
    return replace(settings, b=b), rehearsal.predicted(b), (advice,) if advice else ()


def check_request(form: str, goal: str) -> None:
    """Refuse a form or goal that has no answer here."""
    if form not in FORMS or goal not in GOALS:
        raise Refused(
            "not-offered", f"form is one of {', '.join(FORMS)}; goal one of {', '.join(GOALS)}; got {form}, {goal}."
        )
