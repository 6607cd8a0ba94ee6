"""Quality columns: rows that the data source itself calls bad are left out of every fit, whatever they hold."""

from __future__ import annotations

import re
from collections.abc import Callable

import numpy as np

from ident.findings import Finding, Value
from ident.record.quote import counted, listed, quoted
from ident.record.segments import Flags, Lines
from ident.record.words import BLANK, Words

_GOOD = frozenset(["good", "gut", "ok", "bon", "bonne", "bueno", "buena", "buono", "buona", "valid"])
_BAD = frozenset(
    (
        *("bad", "uncertain", "invalid", "schlecht", "unsicher", "mauvais", "mauvaise", "incertain"),
        *("malo", "mala", "incierto", "cattivo", "incerto"),
    )
)
# OPC DA: the top two bits of a byte, 192 is good; 216 is a forced value, good to act on but not to fit. The low
# two bits say that the value is held at its low (1) or high (2) limit.
_DA_QUALITY, _DA_GOOD, _DA_STATUS, _DA_FORCED, _DA_LIMIT = 0xC0, 0xC0, 0xFC, 0xD8, 0x03
_LIMITS = {1: "low", 2: "high"}
# OPC UA: the top two of 32 bits, 0 is good; a forced value likewise.
_UA_SEVERITY, _UA_FORCED = 30, 0x0096


def judge(columns: dict[str, Words], line: Lines) -> tuple[Flags, list[Finding]]:
    """Rows to leave out, (n,), and what was found in the status columns.

    columns   {header: words}
    line      (n,) file lines
    """
    bad = np.zeros(len(line), dtype=np.bool_)
    found = []
    for name, words in columns.items():
        counts = words.counts()
        good = _language(list(counts), name)
        if good is None:
            found.append(_ignored(counts, words, name))
            continue
        here = ~words.where([w for w in counts if good(w)])
        if here.any():
            bad |= here
            count, first = int(here.sum()), int(line[np.argmax(here)])
            left = counted(count, "row is left out", "rows are left out")
            message = f"{left}, of bad, uncertain or forced quality by column {quoted(name)}"
            evidence: dict[str, Value] = {"column": name, "count": count, "first_line": first}
            found.append(Finding("bad-quality", "warning", f"{message}; the first is line {first}.", evidence))
        if good is _da_good:
            found += _limited(counts, name)
    return bad, found


def _language(words: list[str], name: str) -> Callable[[str], bool] | None:
    """What tells a good word from a bad one; None where the column speaks no known language."""
    if not words:
        return None
    if not all(w.isascii() and w.isdigit() and int(w) < 2**32 for w in words):
        known = all(_leading(w) in _GOOD | _BAD for w in words)
        return (lambda w: _leading(w) in _GOOD) if known else None
    codes = [int(w) for w in words]
    if max(codes) > 0xFFFF or "statuscode" in name.casefold().replace(" ", ""):
        return _ua_good
    if any(code & _DA_QUALITY == _DA_GOOD for code in codes) and max(codes) <= 0xFF:
        return _da_good
    return None  # only zeros, for one: bad in OPC DA, good in OPC UA


def _leading(word: str) -> str:
    match = re.match(r"[^\W_]+", word.casefold())
    return match[0] if match else ""


def _da_good(word: str) -> bool:
    code = int(word)
    return code & _DA_QUALITY == _DA_GOOD and code & _DA_STATUS != _DA_FORCED


def _ua_good(word: str) -> bool:
    code = int(word)
    return code >> _UA_SEVERITY == 0 and code >> 16 != _UA_FORCED


def _limited(counts: dict[str, int], name: str) -> list[Finding]:
    rows = {
        side: sum(n for w, n in counts.items() if _da_good(w) and int(w) & _DA_LIMIT == bits)
        for bits, side in _LIMITS.items()
    }
    if not any(rows.values()):
        return []
    message = (
        f"Column {quoted(name)} says that the value is held at its low limit in {counted(rows['low'])} and at its "
        f"high limit in {rows['high']}: the signal is saturated there."
    )
    evidence: dict[str, Value] = {"column": name, "low": rows["low"], "high": rows["high"]}
    return [Finding("limit-flags", "warning", message, evidence)]


def _ignored(counts: dict[str, int], words: Words, name: str) -> Finding:
    if list(counts) == ["0"]:
        return Finding(
            "status-ambiguous",
            "warning",
            f"Column {quoted(name)} holds only 0, which is good in OPC UA and bad in OPC DA: it was not used and all "
            'rows were kept. Name the column "StatusCode" if it is OPC UA; do not use the log if it is OPC DA.',
            {"column": name, "count": int((words.codes != BLANK).sum())},
        )
    other = len(words.codes) - max(counts.values(), default=len(words.codes))
    apart = counted(other, "row differs", "rows differ")
    differ = f"; it holds {listed(list(counts)[:4])}, and {apart} from the first of these" if other else ""
    return Finding(
        "status-ignored",
        "warning" if other else "info",
        f"Column {quoted(name)} (status) was not used{differ}.",
        {"column": name, "rows_differing": other},
    )
