"""Verdict: what one night says against a baseline, with the figures behind it.

moved       jointly significant, and at least one of K, T, L, K/T significant itself and changed by its practical size
no-news     otherwise, where such a change of neither K nor K/T would have shown: a night that cannot see must not calm
not-moved   otherwise

A parameter is "moved" only on a night that has moved: the joint test alone sets the rate of false alarms, and the
parameters say what it was (Fisher's protected comparisons). It is "no-news" where a move of just its practical size
would not have met the thresholds on average; so a night that shows K may say nothing of T.

On a blind night, one that would be no-news, the model stands on few moves or short ones. There what it leaves out
weighs most, and a first-order fit of a second-order plant trades T against L by more than any covariance tells. So
such a night calls K or K/T alone (K alone where the fits say that they leave something out), and those only where the
change is `BLIND` times what it would have shown. (The rule and the factor are from our simulated nights, no source.)
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from datetime import datetime
from typing import Literal

from ident.errors import Refused
from ident.findings import Finding
from ident.watch.baseline import Baseline
from ident.watch.compare import Distance, along, joint
from ident.watch.coordinates import Reading, place, readings
from ident.watch.margin import MarginDrift
from ident.watch.night import Night

Verdict = Literal["moved", "not-moved", "no-news"]
GAINS = ("K", "K/T")
BLIND = 1.5
UNLIKE = Finding(
    "friction-in-one-only",
    "warning",
    "Dry friction shows in this night or in the baseline, not in both: their K and T are not of one kind and are not "
    "compared. Log a test in which the motor turns both ways, or choose the baseline anew.",
)


@dataclass(frozen=True, slots=True)
class ParameterDrift:
    """One parameter against the baseline; baseline, tonight, change and practical in `unit`.

    statistic, threshold   squared change over its variance, and what it is held to; None without a night
    practical              the least change that counts
    visible                the least change that this night would have shown as often as not; None without a night
    since                  as in Drift
    """

    verdict: Verdict
    statistic: float | None
    threshold: float | None
    baseline: float
    tonight: float | None
    change: float | None
    practical: float
    visible: float | None
    unit: str
    since: datetime | str | None = None

    @property
    def blind(self) -> bool:
        """Whether a move of just the practical size could have passed unseen."""
        return self.visible is None or self.visible > self.practical


@dataclass(frozen=True, slots=True)
class Drift:
    """A night's verdict.

    statistic, threshold, p   of the joint test; None without a night
    since                     key of the first night of the current run of "moved", where a history was given
    """

    verdict: Verdict
    statistic: float | None
    threshold: float | None
    p: float | None
    parameters: dict[str, ParameterDrift]
    margin: MarginDrift | None
    findings: tuple[Finding, ...]
    since: datetime | str | None = None


def verdict(level: Baseline, night: Night | None, significance: float) -> Drift:
    """The night's verdict, margin left out.

    Raises Refused: significance-out-of-range, gain-units-differ.
    """
    if not 0.0 < significance < 0.5:
        raise Refused("significance-out-of-range", "A significance is a probability of false alarm, such as 0.0027.")
    before = readings(level.level.z)
    unlike = night is not None and night.rubbing != level.rubbing
    if night is None or unlike:
        unseen = {name: _unseen(level, name, reading) for name, reading in before.items()}
        return Drift("no-news", None, None, None, unseen, None, level.findings + ((UNLIKE,) if unlike else ()))
    if night.gain_unit != level.gain_unit:
        raise Refused(
            "gain-units-differ",
            f'The night gives K in "{night.gain_unit}", the baseline in "{level.gain_unit}": bring both to one.',
        )
    z = place(night)
    whole = joint(z, level.allowed.around(night), level.level, significance)
    parameters = {
        name: _parameter(level, night, name, reading, whole, significance) for name, reading in before.items()
    }
    if all(parameters[name].blind for name in GAINS):
        trusted = ("K",) if level.allowed.misfits(night) else GAINS
        parameters = {name: _in_the_dark(p, name in trusted) for name, p in parameters.items()}
    if any(p.verdict == "moved" for p in parameters.values()):
        said: Verdict = "moved"
    else:
        said = "no-news" if all(parameters[name].blind for name in GAINS) else "not-moved"
    return Drift(said, whole.statistic, whole.threshold, whole.p, parameters, None, level.findings)


def _parameter(
    level: Baseline, night: Night, name: str, before: Reading, whole: Distance, significance: float
) -> ParameterDrift:
    known, now = level.level, readings(place(night))[name]
    at_level, at_night = before.gradient, now.gradient
    variance = float(
        at_night @ level.allowed.around(night) @ at_night + at_level @ (known.scatter + known.covariance) @ at_level
    )
    estimated = (1.0 + known.share) * float(at_level @ known.scatter @ at_level)
    change, practical = now.value - before.value, level.practical[name]
    own = along(change, variance, estimated, known.degrees, significance)
    visible = math.sqrt(max(own.threshold, whole.threshold) * variance)
    if whole.significant and own.significant and abs(change) >= practical:
        said: Verdict = "moved"
    else:
        said = "no-news" if visible > practical else "not-moved"
    return ParameterDrift(
        said, own.statistic, own.threshold, before.value, now.value, change, practical, visible, _unit(level, name)
    )


def _in_the_dark(found: ParameterDrift, trusted: bool) -> ParameterDrift:
    """The parameter on a blind night, and whether such a night may call it."""
    assert found.change is not None
    assert found.visible is not None
    if trusted and found.verdict == "moved" and abs(found.change) >= BLIND * found.visible:
        return found
    return replace(found, verdict="no-news" if found.verdict == "moved" else found.verdict)


def _unseen(level: Baseline, name: str, before: Reading) -> ParameterDrift:
    return ParameterDrift(
        "no-news", None, None, before.value, None, None, level.practical[name], None, _unit(level, name)
    )


def _unit(level: Baseline, name: str) -> str:
    return {"K": level.gain_unit, "K/T": f"({level.gain_unit})/s" if level.gain_unit else "1/s"}.get(name, "s")
