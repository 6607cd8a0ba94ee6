"""Identification, tuning and watching of motor speed loops: arrays in, frozen values out."""

from ident.errors import IdentError, NotIdentifiable, ReadError, Refused
from ident.estimate import Fit, fit
from ident.findings import Finding
from ident.loop import Margins, PidSettings, margins
from ident.plants import Fopdt
from ident.record import LoopRecord, read_csv
from ident.report import Report, analyse, summary
from ident.tune import Tuning, tune

__all__ = [
    "Finding",
    "Fit",
    "Fopdt",
    "IdentError",
    "LoopRecord",
    "Margins",
    "NotIdentifiable",
    "PidSettings",
    "ReadError",
    "Refused",
    "Report",
    "Tuning",
    "analyse",
    "fit",
    "margins",
    "read_csv",
    "summary",
    "tune",
]
