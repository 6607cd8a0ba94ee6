"""Unseen: a command that moves faster than the log's own samples show.

Between samples a smooth command is taken as straight. With few samples a period that is a guess, and past half the
sample rate the samples show another, slower command altogether: a sweep comes back down the spectrum. Such
rows do not say what the motor was told, so no model can be fitted to them.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ident.record import Exclusion, LoopRecord

WINDOW = 16  # rows looked at together
# Mean square of the second differences over that of the first: 2 (1 - cos w h) for a sine, 0.76 at seven samples a
# period, where straight lines through them lose 7 % of its amplitude.
FAST = 0.75
ALIVE = 0.1  # of the liveliest window's mean square: noise about a steady command is not what the motor answers to
ENOUGH = 0.1  # share of the rows, and of the command's span, that must remain
REASON = "the command moves faster than the log shows"


def seen(record: LoopRecord) -> tuple[LoopRecord, ...]:
    """The record without the rows whose command cannot be known between samples; nothing where all of it is seen.

    Everything from the first such window to the end of the last is left out: what looks slow in between may be the
    samples of something faster, and so may what comes after it, or was before. Therefore the rows on both sides, those
    before and those after are each given, where enough remains to fit.
    """
    fast = [s.start + windows for s in record.segments if len(windows := _fast(record.command[s.slice]))]
    if not fast:
        return ()
    first, stop = int(fast[0][0]), min(int(fast[-1][-1]) + WINDOW + 2, record.rows)
    spans = ((first, stop), (first, record.rows), (0, stop))
    return tuple(_without(record, *span) for span in dict.fromkeys(spans) if _enough(record, *span))


def _without(record: LoopRecord, first: int, stop: int) -> LoopRecord:
    return replace(record, excluded=(*record.excluded, Exclusion(first, stop, REASON)))


def _enough(record: LoopRecord, first: int, stop: int) -> bool:
    rows = np.concatenate([np.arange(s.start, s.stop) for s in record.segments])
    remaining = rows[(rows < first) | (rows >= stop)]
    if len(remaining) < ENOUGH * len(rows):
        return False
    return float(np.ptp(record.command[remaining])) >= ENOUGH * float(np.ptp(record.command[rows]))


def _fast(command: np.ndarray) -> np.ndarray:
    """First rows of the windows in which the command has fewer than seven samples a period."""
    if len(command) < 2 * WINDOW:
        return np.zeros(0, dtype=np.int64)
    first = np.diff(command)
    window = np.ones(WINDOW)
    slow, quick = (np.convolve(d**2, window, "valid") for d in (first[1:], np.diff(first)))
    return np.flatnonzero((quick > FAST * slow) & (slow > ALIVE * slow.max()))
