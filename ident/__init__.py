"""Identification, tuning and watching of motor speed loops: arrays in, frozen values out."""

from ident.errors import IdentError, NotIdentifiable, ReadError, Refused
from ident.record import LoopRecord, read_csv

__all__ = ["IdentError", "LoopRecord", "NotIdentifiable", "ReadError", "Refused", "read_csv"]
