"""Words of messages: what stood in a file, without control characters and never a novel; counts that agree."""

from __future__ import annotations

LONGEST = 40


def printable(text: str) -> str:
    """The text on one line, every character that does not print replaced by ?, at most LONGEST characters."""
    clean = "".join(c if c.isprintable() else "?" for c in text[: LONGEST + 1].strip())
    return clean if len(clean) <= LONGEST else clean[: LONGEST - 1] + "…"


def quoted(text: str) -> str:
    return f'"{printable(text)}"'


def listed(texts: list[str], most: int = 12) -> str:
    """The texts quoted, one after the other; the rest counted."""
    shown = ", ".join(quoted(t) for t in texts[:most])
    return shown if len(texts) <= most else f"{shown} and {len(texts) - most} more"


def counted(count: int, one: str = "row", many: str = "rows") -> str:
    """The count with what goes on after it: "1 row was dropped", "2 rows were dropped"."""
    return f"{count} {one if count == 1 else many}"
