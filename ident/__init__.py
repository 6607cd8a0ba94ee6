"""Identification, tuning and watching of motor speed loops: arrays in, frozen values out."""

from ident.errors import IdentError, NotIdentifiable, ReadError, Refused
from ident.loop import Margins, PidSettings, margins
from ident.plants import Fopdt
from ident.record import LoopRecord, read_csv
from ident.tune import Tuning, tune

__all__ = [
    "Fopdt",
    "IdentError",
    "LoopRecord",
    "Margins",
    "NotIdentifiable",
    "PidSettings",
    "ReadError",
    "Refused",
    "Tuning",
    "margins",
    "read_csv",
    "tune",
]
