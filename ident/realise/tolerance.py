"""Tolerance: what the spread of parts does to a card's margins."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import Any

import numpy as np

from ident.errors import Refused
from ident.loop import margins
from ident.realise.grid import Grid, highest_peak, settles
from ident.realise.network import Card, Parts, response

DRAWS = 500
CHECKED = 3  # of the corners with the highest peak, those whose margins are computed in full


@dataclass(frozen=True, slots=True)
class Spread:
    """Margins over the tolerances of the parts.

    method     what was tried: every corner of the tolerances, and a seeded draw inside them
    Ms_worst   largest max(Ms, Mt) over the corners; None where one of them is unstable
    worst      the parts of that corner
    peak_p95   95th percentile of max(Ms, Mt) over the draw, uniform within the tolerances; None: unstable
    """

    method: str
    stable: bool
    Ms_worst: float | None
    worst: Parts
    peak_p95: float | None


def spread(plant: Any, card: Card, on: Grid, *, R: float, C: float, seed: int) -> Spread:
    """Worst corner and a seeded draw of 500; R, C tolerances as fractions, such as 0.01.

    Raises Refused tolerance-out-of-range.
    """
    if not (0.0 <= R < 0.5 and 0.0 <= C < 0.5):
        raise Refused("tolerance-out-of-range", "Tolerances are fractions from 0 to below 0.5, such as 0.05 for 5 %.")
    given = card.parts.given
    names = list(given)
    size = np.array([C if name.startswith("C") else R for name in names])
    corners = 1.0 + size * np.array(list(itertools.product((-1.0, 1.0), repeat=len(names))))
    drawn = 1.0 + size * np.random.default_rng(seed).uniform(-1.0, 1.0, (DRAWS, len(names)))
    factors = np.concatenate([corners, drawn])
    columns = {name: (given[name] * factors[:, i])[:, None] for i, name in enumerate(names)}
    loop = np.asarray(on.plant * card.scale.gain * response(on.w, columns, card.parts.leak), dtype=np.complex128)
    peak = np.where(settles(loop), highest_peak(loop), np.inf)
    order = np.argsort(-peak[: len(corners)], kind="stable")[:CHECKED]
    tried = []
    for i in order:
        parts = Parts(**{n: given[n] * float(factors[i, k]) for k, n in enumerate(names)}, leak=card.parts.leak)
        tried.append((parts, margins(plant, Card(parts, card.scale, card.sign))))
    stable = all(m.stable for _, m in tried)
    heights = [max(m.Ms or np.inf, m.Mt or np.inf) for _, m in tried]
    worst = int(np.argmax(heights))
    high = float(np.percentile(peak[len(corners) :], 95.0, method="higher"))
    return Spread(
        f"all {len(corners)} corners of {100 * R:g} % resistors and {100 * C:g} % capacitors, and {DRAWS} draws "
        f"uniform within them (seed {seed})",
        stable,
        float(heights[worst]) if stable else None,
        tried[worst][0],
        None if np.isinf(high) else high,
    )
