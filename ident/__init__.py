"""Identification, tuning and watching of motor speed loops: arrays in, frozen values out."""

from ident.errors import IdentError, NotIdentifiable, ReadError, Refused
from ident.estimate import Fit
from ident.findings import Finding
from ident.judge import fit
from ident.loop import Margins, PidSettings, margins
from ident.plants import Arx, Fopdt, Motor, Sopdt, UnderdampedSopdt, from_nameplate
from ident.realise import CardReport, CardScale, Limits, Parts, Realisations, card_as_found, choose_card, realise
from ident.record import LoopRecord, Preview, preview, previewed, read_csv
from ident.report import Report, TuningReport, allowed_again, analyse, summary
from ident.tune import Proposals, Rule, Tuning, propose, tune
from ident.watch import (
    Drift,
    MarginDrift,
    MarginInterval,
    Night,
    ParameterDrift,
    PracticalSize,
    drift,
    drift_history,
    margin_interval,
)

__all__ = [
    "Arx",
    "CardReport",
    "CardScale",
    "Drift",
    "Finding",
    "Fit",
    "Fopdt",
    "IdentError",
    "Limits",
    "LoopRecord",
    "MarginDrift",
    "MarginInterval",
    "Margins",
    "Motor",
    "Night",
    "NotIdentifiable",
    "ParameterDrift",
    "Parts",
    "PidSettings",
    "PracticalSize",
    "Preview",
    "Proposals",
    "ReadError",
    "Realisations",
    "Refused",
    "Report",
    "Rule",
    "Sopdt",
    "Tuning",
    "TuningReport",
    "UnderdampedSopdt",
    "allowed_again",
    "analyse",
    "card_as_found",
    "choose_card",
    "drift",
    "drift_history",
    "fit",
    "from_nameplate",
    "margin_interval",
    "margins",
    "preview",
    "previewed",
    "propose",
    "read_csv",
    "realise",
    "summary",
    "tune",
]
