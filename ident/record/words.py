"""Columns of words (tags, qualities, modes): each row a number, each word spelled once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from ident.record.segments import Flags

Codes = NDArray[np.int32]

BLANK = -1
# A column with more different texts in a block is no column of words.
_MOST = 10_000


@dataclass(frozen=True, slots=True, eq=False)
class Words:
    """codes (n,), positions in `words`, BLANK where the cell is empty."""

    codes: Codes
    words: tuple[str, ...]

    def where(self, chosen: list[str]) -> Flags:
        """Rows that hold one of the given words, (n,)."""
        flags: Flags = np.isin(self.codes, [i for i, w in enumerate(self.words) if w in set(chosen)])
        return flags

    def counts(self) -> dict[str, int]:
        """{word: rows}, the commonest first."""
        found = np.bincount(self.codes[self.codes >= 0], minlength=len(self.words))
        return {self.words[i]: int(found[i]) for i in np.argsort(-found, kind="stable") if found[i]}


def read_words(column: pd.Series) -> Words:
    """One stretch of a column; whole numbers are spelled without a point."""
    codes, uniques = pd.factorize(column)
    if len(uniques) > _MOST:
        uniques = uniques[:_MOST]
        codes = np.where(codes < _MOST, codes, BLANK)
    return Words(codes.astype(np.int32), tuple(_spell(u) for u in uniques))


def spelled(pieces: list[Words]) -> Words:
    """Stretches of one column, one after the other."""
    place: dict[str, int] = {}
    codes = []
    for piece in pieces:
        own = np.array([place.setdefault(w, len(place)) for w in piece.words] + [BLANK], dtype=np.int32)
        codes.append(own[piece.codes])
    return Words(np.concatenate(codes), tuple(place))


def chosen(words: Words, rows: Flags) -> Words:
    """The given rows."""
    return Words(words.codes[rows], words.words)


def _spell(value: object) -> str:
    if isinstance(value, float | np.floating) and float(value).is_integer():
        return f"{float(value):.0f}"
    return str(value).strip()
