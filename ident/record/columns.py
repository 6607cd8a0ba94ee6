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
_HOW = 'say which column is which, for example columns={"time": ..., "command": ..., "speed": ...}'


@dataclass(frozen=True, slots=True)
class Mapped:
    """The columns of a log by role.

    index     {role: position}
    date      position of a date column that stands apart from the time of day, or None
    headers   {role: header}, as the report shows it
    units     {role: unit}, "" where none is named
    quality   {position: header} of status and mode columns
    unread    lines between the header or its units and the data
    """

    index: dict[str, int]
    date: int | None
    headers: dict[str, str]
    units: dict[str, str]
    quality: dict[int, str]
    unread: int


def map_columns(above: tuple[tuple[str, ...], ...], width: int, columns: Columns | None) -> Mapped:
    """Find the header among the rows above the data and map its columns to roles.

    above     rows directly above the data, nearest last
    columns   {role: header name or position}; what it leaves out is mapped by the header's words

    Raises ReadError: unknown-role, missing-column, ambiguous-columns.
    """
    names, unit_row, unread = _header(above, width)
    asked = dict(columns or {})
    unknown = [role for role in asked if role not in ROLES]
    if unknown:
        raise ReadError(
            "unknown-role", f"There is no role {quoted(str(unknown[0]))}: the roles are {', '.join(ROLES)}."
        )
    index = {role: _find(role, want, names, width) for role, want in asked.items() if want is not None}
    if len(set(index.values())) < len(index):
        raise ReadError("ambiguous-columns", f"Two roles were given the same column; {_HOW}.")
    understood = [understand(name) for name in names] if names else []
    kinds: dict[str, list[int]] = {}
    for i, header in enumerate(understood):
        kind = meaning(header)
        if kind and i not in index.values():
            kinds.setdefault(kind, []).append(i)
    date = _by_words(index, kinds, names or [])
    if not names and any(role not in index for role in NEEDED):
        raise ReadError(
            "missing-column",
            'The log has no header row: give the positions, for example columns={"time": 0, "setpoint": 1, '
            '"command": 2, "speed": 3}.',
            {"columns": width},
        )
    for role in NEEDED:
        if role not in index:
            raise ReadError(
                "missing-column",
                f"No column for {role} was recognised among the headers {listed(names or [])}; {_HOW}.",
                {"role": role},
            )
    units = {
        role: printable((unit_row[i] if unit_row else "") or (understood[i].unit if understood else ""))
        for role, i in index.items()
    }
    shown = {
        role: printable(names[i]) if names else f"column {i}" for role, i in sorted(index.items(), key=lambda e: e[1])
    }
    if date is not None and names:
        shown["time"] = f"{printable(names[date])} + {shown['time']}"
    quality = {i: printable((names or [])[i]) for i in kinds.get("quality", [])}
    return Mapped(index, date, shown, units, quality, unread)


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
                    f"give the position for {role}.",
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
