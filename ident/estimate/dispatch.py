"""fit: one record, one model asked for by name; fit_all: every model that the record carries."""

from __future__ import annotations

from ident.errors import NotIdentifiable, Refused
from ident.estimate.fit import Fit
from ident.estimate.fopdt import fit_fopdt
from ident.estimate.ground import ground
from ident.estimate.sopdt import fit_sopdt
from ident.record import LoopRecord

MODELS = ("fopdt", "sopdt", "arx", "auto")


def fit_all(record: LoopRecord, model: str = "auto") -> tuple[Fit, ...]:
    """Fits of a record, the simplest first.

    model  "fopdt" or "sopdt" for that one alone; "auto" for both, the second where the record carries it

    Raises NotIdentifiable where the record has too little in it; Refused (not-offered, unknown-model).
    """
    if model not in MODELS:
        raise Refused("unknown-model", f"Models are {', '.join(MODELS)}.", {"model": model})
    if model == "arx":
        raise Refused("not-offered", "The model arx is not fitted yet: ask for fopdt, sopdt or auto.", {"model": model})
    base = ground(record)
    if model == "sopdt":
        return (fit_sopdt(base),)
    first = fit_fopdt(base)
    if model == "fopdt":
        return (first,)
    try:
        return first, fit_sopdt(base)
    except NotIdentifiable:
        return (first,)  # two time constants are more than this record carries
