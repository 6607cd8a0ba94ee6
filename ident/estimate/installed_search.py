"""Search: the structure and form of a control law, by what they leave of the command unexplained.

Every form of one structure is a sum of the same five columns, so one small Gram matrix serves them all. Structures are
tried from the plain one outwards, and only where the plain one leaves more than the command's own rounding.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np

from ident.estimate.installed_forms import WIDE, Law, best_form, least
from ident.estimate.installed_law import Shaping, Structure, moves
from ident.estimate.installed_polish import polish
from ident.estimate.installed_rows import LATEST, Answers
from ident.loop.law import FilterOn

CLOSE = 1e-5  # share of the command's movement left over, below which nothing else is looked for
ROUNDED = 1.2  # times the sum of squares of rounding alone, likewise
BETTER, SHARE = 20.0, 0.9  # fall of the criterion, and of the sum of squares, that another structure must bring
SWAP = 2.0
ROUGHLY = 0.03  # fall of the sum of squares below which a structure is polished enough to be ranked
ROUNDS = 4
FILTERS: tuple[FilterOn, ...] = ("derivative", "speed", "speed, second order")
SHAPINGS: tuple[Shaping, ...] = ("ramp", "lag")
POLES = (0.15, 0.35, 0.6, 0.8, 0.93)
SHAPES = 10  # lags and ramps tried


@dataclass(frozen=True, slots=True)
class Search:
    """spans; rounding, variance of the command's;  coarse  the rounding is a large part of the command's moves;
    uneven  rows are not on one grid;  moving  the setpoint moves."""

    spans: tuple[Answers, ...]
    rounding: float
    coarse: bool
    uneven: bool
    moving: bool

    def forms(
        self, structure: Structure, only: Iterable[str] | None = None, kinds: tuple[bool, ...] = (False, True)
    ) -> Law | None:
        """The best form of one structure; of a coarse command only the command itself will do, not its moves."""
        kinds = (True,) if self.coarse else kinds
        found = moves(self.spans, structure)
        return best_form(found, structure, self.rounding, moving=self.moving, kinds=kinds, only=only)

    def law(self) -> Law | None:
        """The best law, or None where no form has gains of the right signs."""
        counted = (False, True) if self.uneven else (False,)
        best = least(self.forms(Structure(late=d, counted=c)) for d in range(LATEST + 1) for c in counted)
        late = {0, best.structure.late} if best else {0}
        for _ in range(ROUNDS):  # a filter, a shaping of the setpoint, and each again beside the other
            if best is not None and self._done(best):
                break
            at = best.structure if best else Structure()
            tried = least((self._tried(_filters(at)), self._tried(self._shapings(at, late)) if self.moving else None))
            if tried is None or (best is not None and not _worth(tried, best)):
                break
            best = tried
        return best

    def _tried(self, structures: Iterable[Structure]) -> Law | None:
        """The best of each kind of structure, polished; then the best of those."""
        kinds: dict[tuple[str, str], list[Law]] = {}
        for structure in structures:
            law = self.forms(structure, WIDE, (False,))
            if law is not None:
                kinds.setdefault((structure.filter_on, structure.shaping), []).append(law)
        # Pole and shape move together, so each kind is polished before it is judged.
        found = [polish(self.spans, least(laws), self.forms, ROUGHLY) for laws in kinds.values()]
        return least(self.forms(law.structure) for law in found if law is not None)

    def _shapings(self, base: Structure, late: set[int]) -> Iterable[Structure]:
        step, duration = self.spans[0].step, max(float(s.time[-1]) for s in self.spans)
        largest = max(float(np.abs(np.diff(s.setpoints[0])).max()) for s in self.spans)
        times = np.geomspace(2.0 * step, max(duration / 4.0, 4.0 * step), SHAPES)
        for shaping in SHAPINGS:
            for value in times if shaping == "lag" else largest / times:
                for d in late if base.filter_on == "none" else (base.late,):
                    yield replace(base, late=d, shaping=shaping, shape=float(value))

    def _done(self, law: Law) -> bool:
        return law.left <= max(CLOSE * law.total, ROUNDED * law.rows * self.rounding)


def _filters(base: Structure) -> Iterable[Structure]:
    for filter_on in FILTERS:
        for pole in POLES:
            for d in range(LATEST + 1) if base.shaping == "none" else (base.late,):
                yield replace(base, late=d, filter_on=filter_on, pole=pole)


def _worth(other: Law, law: Law) -> bool:
    """Another filter needs only to be better; one more needs to be clearly so."""
    if _parts(other.structure) <= _parts(law.structure):
        return other.criterion < law.criterion - SWAP
    return other.criterion < law.criterion - BETTER and (other.summed != law.summed or other.left < SHARE * law.left)


def _parts(structure: Structure) -> int:
    return (structure.filter_on != "none") + (structure.shaping != "none")
