"""Propose: the optimum beside the rules that people know, one of them recommended, and why."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

from ident.errors import Refused
from ident.findings import Finding
from ident.loop import Margins, PidSettings
from ident.plants import Fopdt, Sopdt
from ident.tune.band import find_band
from ident.tune.ellipses import FILTER, Limits
from ident.tune.hold import hold, wide
from ident.tune.no_cliff import no_cliff
from ident.tune.rules import Rule, published
from ident.tune.setpoint_weight import OVERSHOOT
from ident.tune.simc import simc
from ident.tune.target import Target, target_of
from ident.tune.tuning import Asked, Tuning, optimum
from ident.tune.worst_case import Cloud


@dataclass(frozen=True, slots=True)
class Proposals:
    """Tunings of one plant, the index of the one to take (None: no tuning at all), and one sentence why.

    rules   published rules for the same form, for comparison
    """

    tunings: tuple[Tuning, ...]
    recommended: int | None
    because: str
    rules: tuple[Rule, ...] = ()


def propose(
    plant: Any,
    *,
    Ms: float | None = None,
    form: str = "pi",
    goal: str = "integral",
    period: float = 0.0,
    compute_delay: float = 0.0,
    filter_ratio: float = FILTER,
    overshoot_percent: float = OVERSHOOT,
    allowed: Cloud | None = None,
    robust: bool | None = None,
    **wanted: float | None,
) -> Proposals:
    """The settings best for the goal under the target, SIMC (for a plant of real lags) and other published rules.

    Arguments and errors as for `tune`; wanted: its other targets. For a PID of the largest ki the settings without the
    derivative cliff stand first and are preferred. With the plants that the log allows (`allowed`), settings that hold
    the target on 95 % of them come before all: robust True; None: where 95 % stay only below 1.1 times the target.
    What misses the target is shown with a finding, never recommended.
    """
    target = target_of(Ms, **wanted)
    model = getattr(plant, "model", plant)
    asked = Asked(model, target, form, goal, period, compute_delay, filter_ratio, overshoot_percent)
    best = asked.best()
    calm = _no_cliff(asked, best)
    held = _held(asked, calm or best, allowed, robust)
    first = [found for found in (held, calm, best) if found]
    reduced = half_rule(model)
    if reduced is None:
        k = next((k for k, one in enumerate(first) if _sound(one, target)), None)
        return Proposals(tuple(first), k, first[k].because if k is not None else "The only proposal does not settle.")
    limit = target.Ms or _reached(best)
    rules = published(model, reduced, limit, form, period=period, compute_delay=compute_delay)
    try:
        rule = _simc(asked, reduced)
    except Refused:  # no dead time at all: the rule needs some
        k = next((k for k, one in enumerate(first) if _sound(one, target)), None)
        return Proposals(tuple(first), k, first[k].because if k is not None else "No proposal settles.", rules)
    tunings = (*first, rule)
    k = next((k for k, one in enumerate(tunings) if _sound(one, target)), None)
    if k is None:
        return Proposals(tunings, None, "No proposal settles at this period within the target.", rules)
    if tunings[k] is rule:
        because = f"The sampled loop does not settle with the optimum; {rule.because}"
    else:
        because = _compare(tunings[k], rule, target)
    return Proposals(tunings, k, because, rules)


def _reached(best: Tuning) -> float:
    return max(best.margins.Ms or 1.0, best.margins.Mt or 1.0)


def _no_cliff(asked: Asked, best: Tuning) -> Tuning | None:
    """The same PID with less derivative action, where a little more of it would cost the margin."""
    if asked.form != "pid" or asked.goal != "integral" or asked.target.Ms is None or asked.target.bounds:
        return None
    settings = no_cliff(find_band(asked.held, "pid"), Limits(asked.target.Ms, ratio=asked.ratio), best.settings)
    if settings is None:
        return None
    share = 100.0 * (1.0 - settings.ki / best.settings.ki)
    return asked.tuning(
        "largest-ki-calm-derivative",
        settings,
        f"It gives up {share:.0f} % of the integral gain for a loop that keeps its margin where the derivative acts a "
        f"little more than meant, with {asked.target.says}.",
    )


def _held(asked: Asked, nominal: Tuning, allowed: Cloud | None, robust: bool | None) -> Tuning | None:
    """Settings that hold the target on 95 % of the allowed plants; None where not wanted or not needed."""
    target = asked.target
    if allowed is None or target.Ms is None or robust is False:
        return None
    M = target.Ms
    if not (robust or wide(allowed, nominal.settings, M)):
        return None
    held = asked.held

    def best(limit: float) -> PidSettings:
        return optimum(held, replace(target, Ms=limit), asked.form, asked.goal, asked.ratio)[0]

    try:
        settings = hold(allowed, M, best)
    except Refused:
        if robust:
            raise
        return None
    share = 100.0 * (1.0 - settings.ki / nominal.settings.ki)
    return asked.tuning(
        "held-for-95-percent",
        settings,
        f"It keeps Ms and Mt at most {M:g} on 95 % of the plants that this log allows, for "
        f"{max(share, 0.0):.0f} % less integral gain than the settings for the fitted plant alone.",
    )


def _sound(tuning: Tuning, target: Target) -> bool:
    return target.kept_by(tuning.margins) and not any(
        f.severity == "error" or f.code == "target-missed" for f in tuning.findings
    )


def half_rule(plant: Any) -> Fopdt | None:
    """The first-order plant that SIMC is meant for: half of the smaller lag goes to each neighbour (Skogestad 2003).

    None for a plant without real lags.
    """
    if isinstance(plant, Fopdt):
        return plant
    if isinstance(plant, Sopdt):
        return Fopdt(plant.K, plant.T1 + plant.T2 / 2.0, plant.L + plant.T2 / 2.0)
    return None


def _simc(asked: Asked, reduced: Fopdt) -> Tuning:
    target, Tc = asked.target, asked.target.closed_loop_s
    settings = simc(reduced.K, reduced.T, reduced.L + asked.period / 2.0 + asked.compute_delay, Tc=Tc)
    what = "equal to the dead time in the loop" if Tc is None else f"{Tc:g} s"
    because = f"The SIMC rule with the closed-loop time constant {what} (Skogestad 2003)."
    found = asked.tuning("simc", settings, because, "pi")
    if target.kept_by(found.margins) and target.quiet(asked.held, found.settings):
        return found
    return replace(found, findings=(*found.findings, _missed(found.margins, target)))


def _missed(found: Margins, target: Target) -> Finding:
    what = f"has Ms {found.Ms:.3f} and Mt {found.Mt:.3f}" if found.stable else "is unstable"
    asked = f"{target.Ms:g}" if target.alone else target.says
    return Finding(
        "target-missed",
        "warning",
        f"With these settings the loop {what}; the target is {asked}.",
        {"Ms": found.Ms, "Mt": found.Mt, "target": target.Ms},
    )


def _compare(best: Tuning, rule: Tuning, target: Target) -> str:
    if best.method != "largest-ki" or not target.alone:
        return best.because
    Ms = target.Ms
    if not _sound(rule, target):
        return (
            f"It has the largest integral gain, {best.settings.ki:.4g}, with Ms and Mt at most {Ms:g}; "
            "the SIMC rule does not on this plant."
        )
    sentence = (
        f"Both meet the target of {Ms:g}; it has the larger integral gain, "
        f"{best.settings.ki:.4g} against {rule.settings.ki:.4g} of the SIMC rule"
    )
    if best.predicted is None or rule.predicted is None:
        return sentence + "."
    mine, theirs = best.predicted.load_step.iae, rule.predicted.load_step.iae
    return sentence + f" (integrated absolute error after a load step {mine:.4g} against {theirs:.4g})."
