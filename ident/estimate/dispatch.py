"""fit: one record, one model asked for by name."""

from __future__ import annotations

from ident.errors import Refused
from ident.estimate.fit import Fit
from ident.estimate.fopdt import fit_fopdt
from ident.record import LoopRecord


def fit(record: LoopRecord, model: str = "auto") -> Fit:
    """Fit a model to a record.

    model  "fopdt", or "auto" for the one that the data support

    Raises NotIdentifiable where the record has too little in it; Refused (not-offered, unknown-model).
    """
    if model in ("fopdt", "auto"):
        return fit_fopdt(record)
    if model in ("sopdt", "arx"):
        raise Refused("not-offered", f"The model {model} is not fitted yet: ask for fopdt or auto.", {"model": model})
    raise Refused("unknown-model", "Models are fopdt, sopdt, arx and auto.", {"model": model})
