"""Identification, tuning and watching of motor speed loops: arrays in, frozen values out."""

from ident.errors import IdentError, NotIdentifiable, ReadError, Refused
from ident.estimate import Fit
from ident.findings import Finding
from ident.judge import fit
from ident.loop import Margins, PidSettings, margins
from ident.plants import Arx, Fopdt, Sopdt, UnderdampedSopdt
from ident.record import LoopRecord, Preview, preview, read_csv
from ident.report import Report, TuningReport, analyse, summary
from ident.tune import Proposals, Tuning, propose, tune
from ident.watch import Drift, MarginDrift, Night, ParameterDrift, PracticalSize, drift, drift_history

__all__ = [
    "Arx",
    "Drift",
    "Finding",
    "Fit",
    "Fopdt",
    "IdentError",
    "LoopRecord",
    "MarginDrift",
    "Margins",
    "Night",
    "NotIdentifiable",
    "ParameterDrift",
    "PidSettings",
    "PracticalSize",
    "Preview",
    "Proposals",
    "ReadError",
    "Refused",
    "Report",
    "Sopdt",
    "Tuning",
    "TuningReport",
    "UnderdampedSopdt",
    "analyse",
    "drift",
    "drift_history",
    "fit",
    "margins",
    "preview",
    "propose",
    "read_csv",
    "summary",
    "tune",
]
