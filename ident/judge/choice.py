"""Choice of model: information criteria and held-out simulation together, said in one sentence."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from ident.errors import NotIdentifiable
from ident.estimate import Fit, Hold, fit_all
from ident.judge.information import too_little
from ident.record import LoopRecord

CLEARLY = 10.0  # AICc: a difference that leaves little doubt (Burnham and Anderson 2002, section 2.6)
WORSE = 1.0  # percent of held-out fit that a richer model may lose before its better criterion counts for nothing


@dataclass(frozen=True, slots=True)
class Choice:
    """Index of the fit to believe, and why."""

    index: int
    because: str


def choose(fits: Sequence[Fit], searched: bool = False) -> Choice:
    """The simplest model, unless a richer one is clearly better by AICc, no worse on held-out rows, and itself known.

    Fits in order of complexity, the first the simplest; one at least.  searched  richer models were allowed
    """
    best, because = 0, f"{NAMES[fits[0].name].capitalize()}: the only model fitted."
    if len(fits) == 1 and searched:
        because = f"{NAMES[fits[0].name].capitalize()}: nothing in its residuals asks for a richer model."
    if len(fits) > 1:
        because = f"{NAMES[fits[0].name].capitalize()}: no richer model describes the log clearly better."
    for i, fit in enumerate(fits[1:], start=1):
        gain = _gain(fits[best], fit)
        if gain is not None and known(fit):
            because = (
                f"{NAMES[fit.name].capitalize()} instead of {NAMES[fits[best].name]}: AICc falls by {gain:.0f}"
                f"{_held_out(fits[best], fit)}, and its time constants stand clear of zero."
            )
            best = i
    return Choice(best, because)


NAMES = {"fopdt": "first order with dead time", "sopdt": "second order with dead time", "arx": "the ARX equation"}


def fit(
    record: LoopRecord, model: str = "auto", *, orders: Sequence[int] | None = None, hold: Hold | None = None
) -> Fit:
    """Fit a model to a record.

    model   "fopdt", "sopdt", "arx", or "auto" for the one of the first two that the data support
    orders  (na, nb, delay) of an ARX model; None: na, nb 1..4 and delay 1..21 are searched
    hold    "zero-order" or "linear": what the command did between samples; None: as the data have it

    Raises NotIdentifiable where the record has too little in it; Refused (unknown-model, orders-without-arx,
    orders-out-of-range).
    """
    fits, refused = believed(record, fit_all(record, model, orders, hold))
    if refused is not None:
        raise refused
    return fits[choose(fits).index]


def believed(record: LoopRecord, fits: tuple[Fit, ...]) -> tuple[tuple[Fit, ...], NotIdentifiable | None]:
    """The same fits, or none and why: what was moved on purpose tells too little to trust any of them."""
    judged = fits[choose(fits).index]
    if judged.driven is None and record.setpoint is not None:
        try:
            judged = fit_all(record, "fopdt")[0]  # an equation does not say what its command was moved by
        except NotIdentifiable:
            return fits, None
    refused = too_little(judged)
    return (fits, None) if refused is None else ((), refused)


def known(fit: Fit) -> bool:
    """Whether every time constant's interval is bounded and clear of zero."""
    times = [e for name, e in fit.parameters.items() if name in ("T", "T1", "T2", "w0", "zeta")]
    return all(e.std is not None and e.value > 2.0 * e.std for e in times)


def _gain(simple: Fit, rich: Fit) -> float | None:
    """Fall of AICc from the simple to the rich model where it counts, else None."""
    before, after = simple.statistics.aicc, rich.statistics.aicc
    if before is None or after is None or before - after < CLEARLY:
        return None
    held_before, held_after = simple.statistics.validation_fit_percent, rich.statistics.validation_fit_percent
    if held_before is not None and held_after is not None and held_after < held_before - WORSE:
        return None
    return before - after


def _held_out(simple: Fit, rich: Fit) -> str:
    before, after = simple.statistics.validation_fit_percent, rich.statistics.validation_fit_percent
    if before is None or after is None:
        return ""
    return f", the fit on held-out rows goes from {before:.1f} to {after:.1f} %"
