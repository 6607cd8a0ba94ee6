"""Drift: has the loop moved tonight, and how much margin has its controller left?"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from ident.loop import PidSettings
from ident.watch.baseline import Baseline, baseline_of
from ident.watch.coordinates import covariance, place
from ident.watch.margin import Controller, SettingsFrom, margin_drift
from ident.watch.night import Estimated, Night
from ident.watch.sizes import PracticalSize
from ident.watch.verdict import Drift, verdict


def drift(
    baseline: Sequence[Night | Estimated],
    tonight: Night | Estimated | None,
    *,
    settings: PidSettings | None = None,
    settings_from: SettingsFrom = "installed",
    period: float = 0.0,
    compute_delay: float = 0.0,
    target: float = 1.6,
    significance: float = 0.0027,
    practical: PracticalSize | None = None,
    seed: int = 0,
) -> Drift:
    """Whether a night's plant has moved from the baseline's, and what the controller makes of it.

    baseline       one or several nights, or first-order fits;  tonight  one more, or None where its log gave no fit
    settings       in the machine; None: those proposed for the baseline's plant at the target
    settings_from  who says so, for the answer: installed (told), or log (seen in one)
    period         controller sample time, s, 0 for analogue;  compute_delay  s;  target  Ms
    significance   of the joint test, per night; 0.0027 is three standard deviations
    practical      least changes that count; None: 10 % of K, 15 % of T and of K/T, L as PracticalSize says
    seed           of the plausible plants behind the margin's interval
    Raises Refused: no-baseline, baseline-disagrees, gain-units-differ, significance-out-of-range, and those of
    `Night` and `margins`.
    """
    level, night = baseline_of(baseline, practical or PracticalSize()), as_night(tonight)
    controller = Controller(settings, settings_from, period, compute_delay, target)
    return with_margin(verdict(level, night, significance), level, night, controller, seed)


def as_night(given: Night | Estimated | None) -> Night | None:
    """The night itself, or that of a fit."""
    return given if given is None or isinstance(given, Night) else Night.of(given)


def with_margin(found: Drift, level: Baseline, night: Night | None, controller: Controller, seed: int) -> Drift:
    """The same verdict with the margins of the controller."""
    z = place(night) if night else None
    own = covariance(night) if night else None
    margin, findings = margin_drift(level.level.z, z, own, controller, seed)
    return replace(found, margin=margin, findings=found.findings + findings)
