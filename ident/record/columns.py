"""Which column is which: by the caller's word, else by the header's."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from ident.errors import ReadError
from ident.record.quote import listed, printable, quoted
from ident.record.vocabulary import is_unit, meaning, understand

ROLES = ("time", "setpoint", "command", "speed")
NEEDED = ("time", "command", "speed")
Columns = Mapping[str, str | int]


_HOW = (
    'say which column is which with the options "time", "setpoint", "command" and "speed" (a header name each, or a '
    "column position counted from 0)"
)


@dataclass(frozen=True, slots=True)
class Mapped:
    """The columns of a log by role.

    layout    wide (one row per sample), long (one row per signal and sample), paired (each signal beside its time)
    index     {role: position}; in a long log the time and the value column (as "value") alone
    clocks    {role: position of its time column} where each signal has its own
    date      position of a date column that stands apart from the time of day, or None
    headers   {role: header}, as the report shows it
    why       {role: how it was recognised}
    units     {role: unit}, "" where none is named
    quality   {position: header} of status columns
    mode      position of a column of manual and automatic, or None
    tag       position of the column that names the signal of a row, or None
    counts    the speed column holds encoder counts by its own header
    unread    lines between the header or its units and the data
    """

    layout: str
    index: dict[str, int]
    clocks: dict[str, int]
    date: int | None
    headers: dict[str, str]
    why: dict[str, str]
    units: dict[str, str]
    quality: dict[int, str]
    mode: int | None
    tag: int | None
    counts: bool
    unread: int


def map_columns(
    above: tuple[tuple[str, ...], ...], width: int, columns: Columns | None, *, counts: bool = False
) -> Mapped:
    """Find the header among the rows above the data and map its columns to roles.

    above     rows directly above the data, nearest last
    columns   {role: header name or position}; what it leaves out is mapped by the header's words
    counts    a column of encoder counts may stand for the speed

    Raises ReadError: unknown-role, missing-column, ambiguous-columns, counts-per-rev-missing.
    """
    names, unit_row, unread = _header(above, width)
    asked = {role: want for role, want in (columns or {}).items() if want is not None}
    unknown = [role for role in asked if role not in ROLES]
    if unknown:
        raise ReadError(
            "unknown-role", f"There is no role {quoted(str(unknown[0]))}: the roles are {', '.join(ROLES)}."
        )
    understood = [understand(name) for name in names or []]
    kinds: dict[str, list[int]] = {}
    for i, header in enumerate(understood):
        kinds.setdefault(meaning(header) or "", []).append(i)
    long = _is_long(kinds)
    index = {role: _find(role, want, names, width) for role, want in asked.items() if not long or role == "time"}
    if len(set(index.values())) < len(index):
        raise ReadError("ambiguous-columns", f"Two roles were given the same column; {_HOW}.")
    why = dict.fromkeys(index, "you named it")
    for kind in kinds:
        kinds[kind] = [i for i in kinds[kind] if i not in index.values()]
    paired: dict[str, int] = {}
    date, in_counts = None, False
    if long:
        index = {"time": index.get("time", kinds["time"][0] if kinds["time"] else -1), "value": kinds["value"][0]}
    else:
        in_counts = counts and "speed" not in index and not kinds.get("speed") and len(kinds.get("counts", [])) == 1
        if in_counts:
            index["speed"], why["speed"] = kinds["counts"][0], "its header names encoder counts"
        paired = _paired(kinds, index)
        if paired:
            kinds["time"] = [paired["speed"]]
        date = _by_words(index, kinds, names or [])
        _check_complete(index, kinds, names, width)
        paired = {role: paired.get(role, paired["speed"]) for role, i in index.items()} if paired else {}
    if index["time"] < 0:
        raise ReadError("missing-column", f"No column for time was recognised; {_HOW}.", {"role": "time"})
    units = {
        role: printable((unit_row[i] if unit_row else "") or (understood[i].unit if understood else ""))
        for role, i in index.items()
    }
    shown = {
        role: printable(names[i]) if names else f"column {i}" for role, i in sorted(index.items(), key=lambda e: e[1])
    }
    for role, i in index.items() if names else ():
        why.setdefault(role, f'its header says "{printable(" ".join(understood[i].words))}"')
    if date is not None and names:
        shown["time"] = f"{printable(names[date])} + {shown['time']}"
    quality = {i: printable((names or [])[i]) for i in kinds.get("quality", [])}
    mode = kinds.get("mode", [])
    return Mapped(
        "long" if long else "paired" if paired else "wide",
        index,
        paired,
        date,
        shown,
        why,
        units,
        quality,
        mode[0] if len(mode) == 1 else None,
        kinds["tag"][0] if long else None,
        in_counts,
        unread,
    )


def map_tags(tags: tuple[str, ...], columns: Columns | None) -> tuple[dict[str, str], dict[str, str]]:
    """Which signal of a long log has which role, {role: tag}, and why.

    Raises ReadError: missing-column, ambiguous-columns.
    """
    asked = {role: want for role, want in (columns or {}).items() if want is not None and role != "time"}
    index = {role: _find(role, want, list(tags), len(tags)) for role, want in asked.items()}
    why = dict.fromkeys(index, "you named it")
    kinds: dict[str, list[int]] = {}
    for i, tag in enumerate(tags):
        if i not in index.values():
            kinds.setdefault(meaning(understand(tag)) or "", []).append(i)
    kinds.pop("time", None)
    _by_words(index, kinds, list(tags))
    _check_complete({**index, "time": 0}, kinds, list(tags), len(tags))
    return (
        {role: tags[i] for role, i in index.items()},
        {
            role: why.get(role, f'its tag says "{printable(" ".join(understand(tags[i]).words))}"')
            for role, i in index.items()
        },
    )


def _is_long(kinds: dict[str, list[int]]) -> bool:
    """One column names the signal, one holds its value, and none is a signal of its own."""
    one = all(len(kinds.get(kind, [])) == 1 for kind in ("tag", "value"))
    return one and bool(kinds.get("time")) and not any(kinds.get(role) for role in ("command", "speed"))


def _paired(kinds: dict[str, list[int]], index: dict[str, int]) -> dict[str, int]:
    """{role: its own time column}: the one left of it, where command and speed have different ones."""
    times = set(kinds.get("time", []))
    if "time" in index or len(times) < 2:
        return {}
    values = {role: index[role] if role in index else (kinds.get(role) or [-1])[0] for role in ROLES[1:]}
    left = {role: _left_of(i, times) for role, i in values.items() if i >= 0}
    apart = left.get("command", -1) >= 0 and left.get("speed", -1) >= 0 and left["command"] != left["speed"]
    return {role: t for role, t in left.items() if t >= 0} if apart else {}


def _left_of(position: int, times: set[int]) -> int:
    return max((t for t in times if t <= position), default=-1)


def _check_complete(index: dict[str, int], kinds: dict[str, list[int]], names: list[str] | None, width: int) -> None:
    missing = [role for role in NEEDED if role not in index]
    if not missing:
        return
    if not names:
        raise ReadError(
            "missing-column",
            'The log has no header row: give the options "time", "command", "speed" (and "setpoint") as column '
            "positions counted from 0, for example time 0, setpoint 1, command 2, speed 3.",
            {"columns": width},
        )
    if missing == ["speed"] and kinds.get("counts"):
        raise ReadError(
            "counts-per-rev-missing",
            f"Column {quoted(names[kinds['counts'][0]])} holds encoder counts: give the option "
            '"counts_per_rev", the counts of one revolution.',
            {"column": printable(names[kinds["counts"][0]])},
        )
    raise ReadError(
        "missing-column",
        f"No column for {missing[0]} was recognised among the headers {listed(names)}; {_HOW}.",
        {"role": missing[0]},
    )


def _header(above: tuple[tuple[str, ...], ...], width: int) -> tuple[list[str] | None, tuple[str, ...] | None, int]:
    """The row with the most known words, the units row under it, and how many more rows stand below."""
    known = [sum(meaning(understand(cell)) is not None for cell in row if cell) for row in above]
    wide = [i for i, row in enumerate(above) if sum(bool(c) for c in row) >= min(2, width)]
    named = [i for i in wide if not all(is_unit(cell) for cell in above[i])] or wide
    if not named:
        return None, None, 0
    best = max(named, key=lambda i: (known[i], i))
    below = above[best + 1 :]
    if below and all(is_unit(cell) for cell in below[0]):
        return list(above[best]), tuple(cell.strip("[]() ") for cell in below[0]), len(below) - 1
    return list(above[best]), None, len(below)


def _find(role: str, want: str | int, names: list[str] | None, width: int) -> int:
    if isinstance(want, str) and names:
        for key in (str.strip, lambda s: s.strip().casefold(), lambda s: " ".join(understand(s).words)):
            hits = [i for i, name in enumerate(names) if key(name) == key(want) and key(want)]
            if len(hits) > 1:
                raise ReadError(
                    "ambiguous-columns",
                    f"The header {quoted(want)} stands {len(hits)} times (positions {', '.join(map(str, hits))}): "
                    f'give option "{role}" as a column position counted from 0.',
                    {"role": role},
                )
            if hits:
                return hits[0]
    position = int(want) if isinstance(want, int) or (want.isascii() and want.isdigit()) else -1
    if 0 <= position < width:
        return position
    among = (
        f"the headers are {listed(names)}" if names else f"the log has no header and {width} columns, 0 to {width - 1}"
    )
    raise ReadError("missing-column", f"There is no column {quoted(str(want))} for {role}: {among}.", {"role": role})


def _by_words(index: dict[str, int], kinds: dict[str, list[int]], names: list[str]) -> int | None:
    """Fill the roles not asked for; the position of a separate date column, or None."""
    found = {role: list(kinds.get(role, [])) for role in ROLES}
    lacks = {role for role in ROLES if role not in index and not found[role]}
    # "input" beside "output" is the pair of the identification trade; "output" alone is whatever is lacking.
    if "command" in lacks and len(kinds.get("input", [])) == 1:
        found["command"] = kinds["input"]
        lacks.discard("command")
    weak = kinds.get("output", [])
    if len(weak) == 1 and len(lacks & {"command", "speed"}) == 1:
        found["speed" if "speed" in lacks else "command"] = weak
        lacks -= {"command", "speed"}
    unclear = weak + kinds.get("cv", [])
    if lacks & {"command", "speed"} and unclear:
        raise ReadError(
            "ambiguous-columns",
            f"{listed([names[i] for i in unclear])} may mean the command or the speed; {_HOW}.",
            {"role": ", ".join(sorted(lacks & {"command", "speed"}))},
        )
    date = None
    if "time" not in index and kinds.get("date"):
        if not found["time"]:
            found["time"] = kinds["date"]
        elif len(kinds["date"]) == 1 and len(found["time"]) == 1:
            date = kinds["date"][0]
    for role in ROLES:
        if role in index or not found[role]:
            continue
        if len(found[role]) > 1:
            raise ReadError(
                "ambiguous-columns",
                f"{len(found[role])} columns may be the {role}: {listed([names[i] for i in found[role]])}; {_HOW}.",
                {"role": role, "candidates": len(found[role])},
            )
        index[role] = found[role][0]
    return date
