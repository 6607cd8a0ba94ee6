"""Quality columns: rows that the data source itself calls bad are left out of every fit, whatever they hold."""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from ident.findings import Finding, Value
from ident.record.columns import Mapped
from ident.record.quote import listed, quoted
from ident.record.segments import Flags
from ident.record.table import Table

_GOOD = frozenset(["good", "gut", "ok", "bon", "bonne", "bueno", "buena", "buono", "buona", "valid"])
_BAD = frozenset(
    (
        *("bad", "uncertain", "invalid", "schlecht", "unsicher", "mauvais", "mauvaise", "incertain"),
        *("malo", "mala", "incierto", "cattivo", "incerto"),
    )
)
# OPC DA: the top two bits of a byte, 192 is good; 216 is a forced value, good to act on but not to fit.
_DA_QUALITY, _DA_GOOD, _DA_STATUS, _DA_FORCED = 0xC0, 0xC0, 0xFC, 0xD8
# OPC UA: the top two of 32 bits, 0 is good; a forced value likewise.
_UA_SEVERITY, _UA_FORCED = 30, 0x0096


def judge(table: Table, mapped: Mapped) -> tuple[Flags, list[Finding]]:
    """Rows to leave out, (n,), and what was found in the status and mode columns."""
    bad = np.zeros(len(table.line), dtype=np.bool_)
    found = []
    for i, name in mapped.quality.items():
        here = _bad_rows(table.cells[i])
        if here is None:
            found.append(_ignored(table.cells[i], name))
        elif here.any():
            bad |= here
            count, first = int(here.sum()), int(table.line[np.argmax(here)])
            message = f"{count} rows are of bad, uncertain or forced quality by column {quoted(name)} and are left out"
            evidence: dict[str, Value] = {"column": name, "count": count, "first_line": first}
            found.append(Finding("bad-quality", "warning", f"{message}; the first is line {first}.", evidence))
    return bad, found


def _bad_rows(cells: pd.Series) -> Flags | None:
    """Rows that are not good; None where the column speaks no known language."""
    if cells.isna().all():
        return None
    if cells.dtype.kind not in "iuf":
        words = cells.astype("str").str.strip().str.casefold().str.extract(r"^([^\W_]+)")[0]
        known = words.isin(_GOOD | _BAD)
        return ~words.isin(_GOOD).to_numpy(dtype=np.bool_) if known[cells.notna()].all() else None
    lost = cells.isna().to_numpy()
    values = cells.fillna(0).to_numpy(dtype=np.float64)
    if values.min() < 0 or values.max() >= 2**32 or (values != np.floor(values)).any():
        return None
    code: NDArray[np.int64] = values.astype(np.int64)
    if code.max() > 0xFFFF:
        good: Flags = (code >> _UA_SEVERITY == 0) & (code >> 16 != _UA_FORCED)
    elif code.max() <= 0xFF and (code & _DA_QUALITY == _DA_GOOD).mean() > 0.5:
        good = (code & _DA_QUALITY == _DA_GOOD) & (code & _DA_STATUS != _DA_FORCED)
    else:
        return None  # only zeros, for one: bad in OPC DA, good in OPC UA
    return ~good | lost


def _ignored(cells: pd.Series, name: str) -> Finding:
    counts = cells.value_counts(dropna=False)
    other = int(counts.sum() - counts.iloc[0])
    shown = listed([str(v) for v in counts.index[:4]])
    differ = f"; it holds {shown}, and {other} rows differ from the first of these" if other else ""
    return Finding(
        "status-ignored",
        "warning" if other else "info",
        f"Column {quoted(name)} (status or mode) was not used{differ}.",
        {"column": name, "rows_differing": other},
    )
