"""Quoting what stood in a file: a message must never carry a control character or a novel."""

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
