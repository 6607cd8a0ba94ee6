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
from ident.watch.sizes import MISFIT, REPEATS, PracticalSize, differing

ROUNDING = 1e-9  # relative; no night is known better, which keeps every covariance invertible
FEW = 4  # nights below which the scatter between them is hardly known
# One or two nights do not even tell whether a first-order model describes the plant: quiet nights of a second-order one
# pass every test now and then, and differ in T by a sixth. What such a baseline is to call must be more than that.
# K stands on the levels, whatever the dynamics. From our simulated nights, significance 0.001, one baseline night:
#   two lags of 1 s, noise 0.1 rpm   4 of 1,000 unchanged nights called without the factor, 0 with it
#   the same, noise 0.5 rpm          0 of 2,000 either way
#   one lag, noise 2 rpm             T 20 % longer found within two nights in 59 of 60 series without, 20 with;
#                                    T 30 % longer in 60 of 60 either way; steps of K are not touched
# It is kept because a false call costs trust for good, while T 20 % off adds at most 0.12 to an Ms of 1.6 (PI of the
# largest integral gain, L/T of 0.1 to 3), and three nights lift it.
TOO_FEW, MORE = 3, 1.5


@dataclass(frozen=True, slots=True, eq=False)
class Allowed:
    """How nights differ beside their errors.

    repeats   (3, 3), healthy ones;  misfit  (3, 3), added where the model leaves something out
    always    whether the baseline already says that it does;  size_L  practical size of L, s
    """

    repeats: Floats
    misfit: Floats
    always: bool
    size_L: float

    def misfits(self, night: Night) -> bool:
        """Whether the model leaves something out. The plant's affair: a log that fails to show it is no proof."""
        return night.misfit or self.always

    def around(self, night: Night) -> Floats:
        """(3, 3): the night's covariance with what is allowed, dead time widened where it is poorly known.

        A dead time is found among the minima of many cells. As noise grows a wrong one wins, and errors come with tails
        that no first-order covariance knows (the threshold effect of delay estimation: Weiss and Weinstein 1983, IEEE
        Trans. ASSP 31, 472-486). So its variance is doubled where three standard deviations reach the practical size,
        and left alone where they are far below it. (The factor is from our simulated nights, no source.)
        """
        own = covariance(night)
        wide = 1.0 + 9.0 * own[2, 2] / self.size_L**2 if self.size_L > 0.0 else 1.0
        widen = np.array([1.0, 1.0, np.sqrt(wide)])
        allowed = self.repeats + self.misfit if self.misfits(night) else self.repeats
        return np.asarray(own * np.outer(widen, widen) + allowed)


@dataclass(frozen=True, slots=True, eq=False)
class Baseline:
    """What later nights meet.

    level       what they are compared with;  gain_unit  of K;  findings  about the baseline
    practical   least changes that count, each in its parameter's unit
    allowed     how a night may differ from its plant's usual place, its own error left out
    rubbing     its nights were fitted with dry friction
    """

    level: Level
    practical: dict[str, float]
    allowed: Allowed
    gain_unit: str
    findings: tuple[Finding, ...]
    rubbing: bool = False


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
    if len({n.rubbing for n in nights}) > 1:
        raise Refused(
            "baseline-disagrees",
            "Dry friction shows in some of the baseline's nights only, and there K and T are those of the moving "
            "motor: take nights of one kind.",
        )
    z, own = np.array([place(n) for n in nights]), np.array([covariance(n) for n in nights])
    middle = np.median(z, axis=0)
    K, T = float(middle[0] / middle[1]), float(1.0 / middle[1])
    std_T = T**2 * float(np.sqrt(np.median(own[:, 1, 1])))
    sizes = practical.at(middle, std_T)
    repeats = differing(sizes, REPEATS, K, T)
    repeats += np.diag((ROUNDING * np.array([middle[0], middle[1], T + middle[2]])) ** 2)
    misfit = differing(sizes, MISFIT, K, T) / len(nights)
    allowed = Allowed(repeats, misfit, any(n.misfit for n in nights), sizes["L"])
    found = level(z, np.array([allowed.around(n) for n in nights]))
    # Integrating nights may average to a pole at or beyond 0: T is then as long as their errors allow, and unknown.
    pole = max(float(found.z[1]), 0.01 * float(np.sqrt(found.covariance[1, 1])))
    found = replace(found, z=np.array([found.z[0], pole, max(float(found.z[2]), 0.0)]))
    if len(nights) < TOO_FEW:
        sizes = {name: size if name == "K" else MORE * size for name, size in sizes.items()}
    return Baseline(found, sizes, allowed, nights[0].gain_unit, _findings(nights), nights[0].rubbing)


def _findings(nights: list[Night]) -> tuple[Finding, ...]:
    if len(nights) >= FEW:
        return ()
    misfit = sum(n.misfit for n in nights)
    widely = ", and widely, as the first-order model does not quite describe this plant" if misfit else ""
    wider = f"; changes of T, L and K/T count from {MORE:g} times their practical size" if len(nights) < TOO_FEW else ""
    return (
        Finding(
            "few-baseline-nights",
            "warning" if misfit else "info",
            f"The baseline has {len(nights)} night{'s' if len(nights) > 1 else ''}, so how far healthy nights differ "
            f"is assumed more than known{widely}{wider}. Add nights with ordinary moves of different lengths: five or "
            "more.",
            {"nights": len(nights), "nights_with_misfit": misfit},
        ),
    )
