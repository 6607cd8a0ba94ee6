"""Repair: the fewest parts to change on a card so that its loop reaches a target."""

from __future__ import annotations

import itertools
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from ident.loop import Margins, margins
from ident.realise.choose_parts import SLACK, Limits
from ident.realise.grid import Grid, highest_peak, settles
from ident.realise.network import Card, Parts, response
from ident.realise.preferred import values

MOST = 2  # parts changed at once
WITHIN = 30.0  # a new value is at most so many times larger or smaller than the old
CHECKED = 20


@dataclass(frozen=True, slots=True)
class Change:
    """Parts to change, by name and new value (ohm, F), and the margins they lead to; {} where nothing has to change.

    parts None: not even with two parts is the target reached.
    """

    change: dict[str, float]
    parts: Parts | None
    margins: Margins | None
    because: str


def repair(plant: Any, card: Card, on: Grid, *, target: float, limits: Limits, found: Margins) -> Change:
    """One part, else two, from the series within the limits: of those that keep max(Ms, Mt) the one with the
    largest integral gain. Ra and Rl stay as they are."""
    if _meets(found, target):
        return Change({}, card.parts, found, f"The card as it is keeps the target of {target:g}.")
    given = card.parts.given
    names = [name for name in given if name not in ("Ra", "Rl")]
    for count in range(1, MOST + 1):
        best: list[tuple[float, Parts, tuple[str, ...]]] = []
        for which in itertools.combinations(names, count):
            best += _tried(card, on, which, limits, target)
        best.sort(key=lambda one: -one[0])
        for _, parts, which in best[:CHECKED]:
            reached = margins(plant, Card(parts, card.scale, card.sign))
            if _meets(reached, target):
                return Change(
                    {name: getattr(parts, name) for name in which},
                    parts,
                    reached,
                    f"No smaller change reaches the target of {target:g}; of those with {count} "
                    f"{'part' if count == 1 else 'parts'} it leaves the largest integral gain.",
                )
    return Change({}, None, None, f"No change of one or two parts within the limits reaches {target:g}.")


def _tried(
    card: Card, on: Grid, which: tuple[str, ...], limits: Limits, target: float
) -> list[tuple[float, Parts, tuple[str, ...]]]:
    given = card.parts.given
    choices = [_choices(name, given[name], limits) for name in which]
    columns: dict[str, Any] = dict(given)
    for name, values_ in zip(which, np.meshgrid(*choices, indexing="ij"), strict=True):
        columns[name] = values_.ravel()
    ki = columns["Rb"] / columns["Ra"] / (columns["R1"] * columns["C2"]) * np.ones(len(columns[which[0]]))
    # In order of ki, a piece at a time: the first that keeps the target is the best.
    order = np.argsort(-ki, kind="stable")
    found: list[tuple[float, Parts, tuple[str, ...]]] = []
    w = on.w[::2]
    for start in range(0, len(order), 256):
        piece = order[start : start + 256]
        rows = {n: (v[piece][:, None] if isinstance(v, np.ndarray) else v) for n, v in columns.items()}
        loop = np.asarray(on.plant[::2] * card.scale.gain * response(w, rows, card.parts.leak), dtype=np.complex128)
        keeps = highest_peak(loop) <= target + SLACK
        for i in piece[keeps][settles(loop[keeps])][:3]:
            new: dict[str, Any] = {name: float(columns[name][i]) for name in which}
            found.append((float(ki[i]), replace(card.parts, **new), which))
        if found:
            break
    return found


def _choices(name: str, old: float, limits: Limits) -> Any:
    if name.startswith("C"):
        row = values(limits.C_series, limits.C_low, limits.C_high)
    else:
        row = values(limits.R_series, limits.Rd_low if name == "Rd" else limits.R_low, limits.R_high)
    return row[(row >= old / WITHIN) & (row <= old * WITHIN)]


def _meets(found: Margins, target: float) -> bool:
    return found.Ms is not None and found.Mt is not None and max(found.Ms, found.Mt) <= target + 0.005
