"""The fits: start values, separable least squares, dead-time profile, what was noticed."""

from ident.estimate.applied import applied
from ident.estimate.dispatch import fit_all
from ident.estimate.driven import Driven
from ident.estimate.fit import DeadTimeProfile, Fit
from ident.estimate.friction import Friction
from ident.estimate.ground import Hold
from ident.estimate.installed import Recovered, recover
from ident.estimate.plausible import plausible, plausible_again, spread_of

__all__ = [
    "DeadTimeProfile",
    "Driven",
    "Fit",
    "Friction",
    "Hold",
    "Recovered",
    "applied",
    "fit_all",
    "plausible",
    "plausible_again",
    "recover",
    "spread_of",
]
