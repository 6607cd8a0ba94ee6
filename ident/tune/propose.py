"""Propose: the optimum beside the rule that people know, one of them recommended, and why."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from ident.findings import Finding
from ident.loop import Margins, margins
from ident.plants import Fopdt, Sopdt
from ident.tune.simc import simc
from ident.tune.tuning import Tuning, rehearse, tune

TOLERANCE = 0.005  # above the target, in Ms or Mt


@dataclass(frozen=True, slots=True)
class Proposals:
    """Tunings of one plant, the index of the one to take (None: no tuning at all), and one sentence why."""

    tunings: tuple[Tuning, ...]
    recommended: int | None
    because: str


def propose(
    plant: Any,
    *,
    Ms: float = 1.6,
    form: str = "pi",
    goal: str = "integral",
    period: float = 0.0,
    compute_delay: float = 0.0,
) -> Proposals:
    """The settings best for the goal under the target and, for a plant of real lags, SIMC with its margins.

    Arguments and errors as for `tune`. What misses the target is shown with a finding, never recommended.
    """
    best = tune(plant, Ms=Ms, form=form, goal=goal, period=period, compute_delay=compute_delay)
    model = getattr(plant, "model", plant)
    reduced = half_rule(model)
    if reduced is None:
        sound = _sound(best, Ms)
        return Proposals((best,), 0 if sound else None, best.because if sound else "The only proposal does not settle.")
    rule = _simc(model, reduced, Ms, period, compute_delay)
    if _sound(best, Ms):
        return Proposals((best, rule), 0, _compare(best, rule, Ms))
    if _sound(rule, Ms):
        return Proposals((best, rule), 1, f"The sampled loop does not settle with the optimum; {rule.because}")
    return Proposals((best, rule), None, "Neither proposal settles at this period within the target.")


def _sound(tuning: Tuning, Ms: float) -> bool:
    return meets(tuning.margins, Ms) and not any(f.severity == "error" for f in tuning.findings)


def meets(found: Margins, Ms: float) -> bool:
    """Whether a loop is stable with Ms and Mt at most the target, within TOLERANCE."""
    if found.Ms is None or found.Mt is None:
        return False
    return found.stable and max(found.Ms, found.Mt) <= Ms + TOLERANCE


def half_rule(plant: Any) -> Fopdt | None:
    """The first-order plant that SIMC is meant for: half of the smaller lag goes to each neighbour (Skogestad 2003).

    None for a plant without real lags.
    """
    if isinstance(plant, Fopdt):
        return plant
    if isinstance(plant, Sopdt):
        return Fopdt(plant.K, plant.T1 + plant.T2 / 2.0, plant.L + plant.T2 / 2.0)
    return None


def _simc(model: Any, reduced: Fopdt, Ms: float, period: float, compute_delay: float) -> Tuning:
    timing = {"period": period, "compute_delay": compute_delay}
    settings = simc(reduced.K, reduced.T, reduced.L + period / 2.0 + compute_delay)
    found = margins(model, settings, **timing)
    findings: tuple[Finding, ...] = ()
    predicted = None
    if found.stable:
        settings, predicted, findings = rehearse(model, settings, period, compute_delay)
    if not meets(found, Ms):
        findings = (*findings, _missed(found, Ms))
    return Tuning(
        "simc",
        "pi",
        settings,
        found,
        predicted,
        findings,
        "The SIMC rule with the closed-loop time constant equal to the dead time in the loop (Skogestad 2003).",
    )


def _missed(found: Margins, Ms: float) -> Finding:
    what = f"has Ms {found.Ms:.3f} and Mt {found.Mt:.3f}" if found.stable else "is unstable"
    return Finding(
        "target-missed",
        "warning",
        f"With these settings the loop {what}; the target is {Ms:g}.",
        {"Ms": found.Ms, "Mt": found.Mt, "target": Ms},
    )


def _compare(best: Tuning, rule: Tuning, Ms: float) -> str:
    if best.method != "largest-ki":
        return best.because
    if not _sound(rule, Ms):
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
