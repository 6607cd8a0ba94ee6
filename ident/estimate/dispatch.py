"""fit: one record, one model asked for by name; fit_all: every model that the record carries."""

from __future__ import annotations

from collections.abc import Sequence

from ident.errors import NotIdentifiable, Refused
from ident.estimate.arx import fit_arx
from ident.estimate.fit import Fit
from ident.estimate.fopdt import fit_fopdt
from ident.estimate.ground import Hold, ground
from ident.estimate.second_lag import nothing_left
from ident.estimate.sopdt import fit_sopdt
from ident.record import LoopRecord

MODELS = ("fopdt", "sopdt", "arx", "auto")


def fit_all(
    record: LoopRecord, model: str = "auto", orders: Sequence[int] | None = None, hold: Hold | None = None
) -> tuple[Fit, ...]:
    """Fits of a record, the simplest first.

    model   "fopdt", "sopdt" or "arx" for that one alone; "auto" for the first two, the second where the first leaves
            something and the record carries it
    orders  (na, nb, delay) of an ARX model; None: searched
    hold    "zero-order" or "linear": what the command did between samples; None: as the data have it

    Raises NotIdentifiable where the record has too little in it; Refused (unknown-model, orders-without-arx,
    orders-out-of-range).
    """
    if model not in MODELS:
        raise Refused("unknown-model", f"Models are {', '.join(MODELS)}.", {"model": model})
    if hold not in (None, "zero-order", "linear"):
        raise Refused("unknown-hold", "Between samples a command is zero-order or linear.", {"hold": str(hold)})
    if model == "arx":
        return (fit_arx(record, orders),)
    if orders is not None:
        raise Refused("orders-without-arx", "Only an ARX model has orders: ask for model arx.", {"model": model})
    base = ground(record, hold)
    if model == "sopdt":
        return (fit_sopdt(base),)
    first = fit_fopdt(base)
    if model == "fopdt" or nothing_left(base, first.statistics):
        return (first,)
    try:
        return first, fit_sopdt(base)
    except NotIdentifiable:
        return (first,)  # two time constants are more than this record carries
