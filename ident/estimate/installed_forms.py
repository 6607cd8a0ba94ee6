"""Forms: PI, PID and their setpoint weights, fitted to the columns of one structure."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from dataclasses import dataclass

import numpy as np

from ident.estimate.installed_law import FORMS, Moves, Structure
from ident.evidence.normal import solve_normal
from ident.record.segments import Floats

FLOOR = 1e-9  # share below which digits decide, not laws
WIDE = ("PI-D, weighted", "PID, weighted")  # every other form is one of these with a part less
STILL = ("PI", "PID")  # all that can be told apart where the setpoint never moves
NAMES = ("ki", "Kp", "Kp b", "kd")


@dataclass(frozen=True, slots=True)
class Law:
    """A structure with a form, fitted.

    summed     the fit is of the command itself, not of its moves
    left       sum of squares left over;  total  of the moves (or of the levelled command);  rows
    criterion  rows ln(left/rows) + parameters ln(rows), left at least that of rounding
    """

    structure: Structure
    form: str
    summed: bool
    gains: tuple[float, ...]
    left: float
    total: float
    rows: int
    criterion: float

    @property
    def named(self) -> dict[str, float]:
        """The gains that the form has, by NAMES."""
        return dict(zip(names(self.form), self.gains, strict=True))


def names(form: str) -> list[str]:
    """The parameters of a form, in its order."""
    return [name for name, columns in zip(NAMES, FORMS[form], strict=False) if columns]


def parts(form: str, columns: Floats) -> Floats:
    """What each parameter multiplies, (parameters, n), from the five columns."""
    return np.array([columns[list(c)].sum(axis=0) for c in FORMS[form] if c])


def best_form(
    found: Moves,
    structure: Structure,
    rounding: float,
    *,
    moving: bool,
    kinds: tuple[bool, ...],
    only: Iterable[str] | None = None,
) -> Law | None:
    """The form of one structure with the least criterion, of the command's moves or of the command itself.

    rounding  variance of the command's;  kinds  which to try: True, the command itself; False, its moves
    """
    forms = [f for f in only or FORMS if moving or f in STILL] or list(STILL)
    return least(
        law
        for summed in kinds
        for law in _fitted(found.summed() if summed else found, structure, forms, rounding, summed=summed)
    )


def least(laws: Iterable[Law | None]) -> Law | None:
    """The law with the least criterion."""
    return min((law for law in laws if law is not None), key=lambda law: law.criterion, default=None)


def _fitted(found: Moves, structure: Structure, forms: list[str], rounding: float, *, summed: bool) -> Iterator[Law]:
    stacked = np.vstack((found.columns, found.command))
    gram = stacked @ stacked.T
    rows, total = int(found.command.size) - (len(found.lengths) if summed else 0), float(gram[5, 5])
    if total <= 0.0:
        return
    # Moves of a rounded command carry its rounding twice; of one rounded where it sums up, once.
    floor = max(rows * rounding, FLOOR * total)
    for form in forms:
        own = parts(form, gram)
        right = own[:, 5]
        gains = solve_normal(parts(form, own[:, :5].T), right)
        left = max(total - float(gains @ right), 0.0)
        if not _right_signs(form, gains):
            continue
        p = len(gains) + (structure.filter_on != "none") + (structure.shaping != "none")
        criterion = rows * math.log(max(left, floor) / rows) + p * math.log(rows)
        yield Law(structure, form, summed, tuple(gains.tolist()), left, total, rows, criterion)


def _right_signs(form: str, gains: Floats) -> bool:
    """Integral, proportional and derivative parts all push the same way; a setpoint weight lies from 0 to 2.

    Read as a trapezoid, the weight 0 of a forward sum is -x/(1 - x) with x = h/(2 Ti).
    """
    if gains[1] == 0.0 or gains[0] * gains[1] <= 0.0:
        return False
    share = dict(zip(names(form), gains / gains[1], strict=True))
    return bool(share.get("kd", 0.0) >= 0.0 and -0.5 <= share.get("Kp b", 1.0) <= 2.0)
