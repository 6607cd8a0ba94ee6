"""Baseline: the nights that others are compared with, made ready once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from ident.errors import Refused
from ident.findings import Finding
from ident.record.segments import Floats
from ident.watch.coordinates import covariance, place
from ident.watch.level import Level, level
from ident.watch.night import Estimated, Night
from ident.watch.sizes import PracticalSize, repeatability

ROUNDING = 1e-9  # relative; no night is known better, which keeps every covariance invertible
FEW = 4  # nights below which the scatter between them is hardly known


@dataclass(frozen=True, slots=True, eq=False)
class Baseline:
    """level: what is compared with;  sizes: practical, in each parameter's unit;
    repeats: (3, 3) how a healthy night differs from the next;  gain_unit: of K;  findings: about the baseline."""

    level: Level
    sizes: dict[str, float]
    repeats: Floats
    gain_unit: str
    findings: tuple[Finding, ...]

    def known(self, night: Night) -> Floats:
        """(3, 3): how far a night may lie from its plant's usual place, as far as that is known."""
        return known(night, self.sizes, self.repeats)


def baseline_of(given: Sequence[Night | Estimated], practical: PracticalSize) -> Baseline:
    """A baseline of one or several nights.

    Raises Refused: no-baseline, baseline-disagrees, gain-units-differ.
    """
    nights = [n if isinstance(n, Night) else Night.of(n) for n in given]
    if not nights:
        raise Refused("no-baseline", "Name at least one night with a fit as the baseline; five or more say more.")
    if len({n.gain_unit for n in nights}) > 1:
        raise Refused(
            "gain-units-differ", "The baseline's nights give K in different units: bring all logs to one unit of speed."
        )
    if len({n.K > 0 for n in nights}) > 1:
        raise Refused(
            "baseline-disagrees",
            "The gain changes its sign between the baseline's nights: leave out those before the wiring was changed.",
        )
    z, own = np.array([place(n) for n in nights]), np.array([covariance(n) for n in nights])
    middle = np.median(z, axis=0)
    K, T = float(middle[0] / middle[1]), float(1.0 / middle[1])
    std_T = T**2 * float(np.sqrt(np.median(own[:, 1, 1])))
    sizes = practical.at(middle, std_T)
    repeats = repeatability(sizes, K, T)
    repeats += np.diag((ROUNDING * np.array([middle[0], middle[1], T + middle[2]])) ** 2)
    found = level(z, np.array([known(n, sizes, repeats) for n in nights]))
    # Integrating nights may average to a pole at or beyond 0: T is then as long as their errors allow, and unknown.
    pole = max(float(found.z[1]), 0.01 * float(np.sqrt(found.covariance[1, 1])))
    found = replace(found, z=np.array([found.z[0], pole, max(float(found.z[2]), 0.0)]))
    return Baseline(found, sizes, repeats, nights[0].gain_unit, _findings(len(nights)))


def _findings(nights: int) -> tuple[Finding, ...]:
    if nights >= FEW:
        return ()
    return (
        Finding(
            "few-baseline-nights",
            "info",
            f"The baseline has {nights} night{'s' if nights > 1 else ''}, so how far healthy nights differ is "
            "assumed more than known. Add nights with ordinary moves of different lengths: five or more.",
            {"nights": nights},
        ),
    )


def known(night: Night, sizes: dict[str, float], repeats: Floats) -> Floats:
    """The night's covariance and the repeatability together, dead time widened where it is poorly known.

    A dead time is found among the minima of many cells. As noise grows a wrong one wins, and errors come with tails
    that no first-order covariance knows (the threshold effect of delay estimation: Weiss and Weinstein 1983, IEEE
    Trans. ASSP 31, 472-486). So its variance is doubled where three standard deviations reach the practical size,
    and left alone where they are far below it. (The factor is from our simulated nights, no source.)
    """
    own = covariance(night)
    wide = 1.0 + 9.0 * own[2, 2] / sizes["L"] ** 2 if sizes["L"] > 0.0 else 1.0
    widen = np.array([1.0, 1.0, np.sqrt(wide)])
    return np.asarray(own * np.outer(widen, widen) + repeats)
