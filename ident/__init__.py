"""Identification, tuning and watching of motor speed loops: arrays in, frozen values out."""

from ident.errors import IdentError, NotIdentifiable, ReadError, Refused
from ident.estimate import Fit, fit
from ident.findings import Finding
from ident.loop import Margins, PidSettings, margins
from ident.plants import Fopdt
from ident.record import LoopRecord, read_csv
from ident.report import Report, analyse, summary
from ident.tune import Tuning, tune
from ident.watch import Drift, MarginDrift, Night, ParameterDrift, PracticalSize, drift, drift_history

__all__ = [
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
    "ReadError",
    "Refused",
    "Report",
    "Tuning",
    "analyse",
    "drift",
    "drift_history",
    "fit",
    "margins",
    "read_csv",
    "summary",
    "tune",
]
