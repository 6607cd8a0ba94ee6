"""Reading and cleaning: bytes of a CSV to a LoopRecord with its segments."""

from ident.record.read import read_csv
from ident.record.record import LoopRecord, Source
from ident.record.segments import Exclusion, Segment

__all__ = ["Exclusion", "LoopRecord", "Segment", "Source", "read_csv"]
