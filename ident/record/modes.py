"""Modes: where the controller was in manual, automatic or cascade, and what the setpoint means there."""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from ident.findings import Finding
from ident.record.quote import counted, listed, quoted
from ident.record.record import ModeSpan
from ident.record.segments import Floats
from ident.record.words import BLANK, Words

MODES = {
    **dict.fromkeys(["man", "manual", "m", "hand", "manuell", "manuel", "manuelle", "manuale"], "manual"),
    **dict.fromkeys(["auto", "automatic", "a", "automatik", "automatisch", "automatique", "automatico"], "automatic"),
    **dict.fromkeys(["cas", "cascade", "c", "rcas", "remote", "kaskade", "cascada", "cascata"], "cascade"),
}
TRACKING = 0.9  # share of a manual span's rows where the setpoint equals the speed


def mode_spans(words: Words, name: str) -> tuple[tuple[ModeSpan, ...], list[Finding]]:
    """Spans of one mode each; a blank means the mode before. Unknown words: no spans and a finding."""
    known = [MODES.get(word.casefold(), "") for word in words.words]
    counts = words.counts()
    if not all(MODES.get(word.casefold()) for word in counts) or not counts:
        message = (
            f"Column {quoted(name)} (mode) holds {listed(list(counts)[:6])} and was not used: the words for manual, "
            "automatic and cascade are MAN, AUTO and CAS."
        )
        return (), [Finding("mode-ignored", "warning", message, {"column": name, "words": len(counts)})]
    kinds = sorted(set(known))
    number = np.array([*(kinds.index(k) for k in known), BLANK])[words.codes]
    filled = np.maximum.accumulate(np.where(number >= 0, np.arange(len(number)), 0))
    number = number[filled]
    edges = np.concatenate(([0], np.flatnonzero(np.diff(number)) + 1, [len(number)]))
    return (
        tuple(ModeSpan(a, b, kinds[number[a]]) for a, b in pairwise(edges.tolist()) if number[a] >= 0),
        [],
    )


def without_tracking(setpoint: Floats, speed: Floats, modes: tuple[ModeSpan, ...]) -> tuple[Floats, list[Finding]]:
    """The setpoint without manual spans in which it only follows the speed: that is no perfect control."""
    out = setpoint.copy()
    rows = 0
    for span in modes:
        here = slice(span.start, span.stop)
        if span.mode == "manual" and np.mean(setpoint[here] == speed[here]) >= TRACKING:
            out[here] = np.nan
            rows += span.stop - span.start
    if not rows:
        return setpoint, []
    message = (
        f"In {counted(rows)} in manual the setpoint only follows the measured speed (setpoint tracking): it "
        "commands nothing there and is taken as unknown."
    )
    return out, [Finding("setpoint-tracks-speed", "info", message, {"count": rows})]
