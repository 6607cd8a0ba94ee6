"""Tyreus and Luyben 1992: the ultimate gain and period, for calmer loops."""

from __future__ import annotations

from ident.loop import PidSettings
from ident.tune.ellipses import FILTER
from ident.tune.rules.ultimate import Ultimate


def tyreus_luyben(at: Ultimate, form: str) -> PidSettings:
    """PI Ku/3.2, 2.2 Pu; PID Ku/2.2, 2.2 Pu, Pu/6.3. Tyreus and Luyben 1992, Ind. Eng. Chem. Res. 31, 2625-2628."""
    if form == "pi":
        return PidSettings(at.Ku / 3.2, 2.2 * at.Pu)
    return PidSettings(at.Ku / 2.2, 2.2 * at.Pu, at.Pu / 6.3, at.Pu / 6.3 / FILTER)
