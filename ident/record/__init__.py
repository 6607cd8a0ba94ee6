"""Reading and cleaning: bytes of a CSV to a LoopRecord with its segments."""

from ident.record.preview import Preview, preview, previewed
from ident.record.read import read_csv
from ident.record.record import LoopRecord, ModeSpan, Source, Understood
from ident.record.segments import Exclusion, Segment

__all__ = [
    "Exclusion",
    "LoopRecord",
    "ModeSpan",
    "Preview",
    "Segment",
    "Source",
    "Understood",
    "preview",
    "previewed",
    "read_csv",
]
