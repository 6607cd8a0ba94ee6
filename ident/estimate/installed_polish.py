"""Polish: a law's filter and the shaping of its setpoint by Gauss-Newton, its gains solved at every step."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from typing import TypeAlias

import numpy as np

from ident.estimate.installed_forms import Law, parts
from ident.estimate.installed_law import Structure, moves
from ident.estimate.installed_rows import Answers
from ident.record.segments import Floats

ROUNDS, HALVINGS = 10, 5
NUDGE = 1e-4
SETTLED = 1e-4  # relative fall of the sum of squares
QUICKEST = 2.0  # periods that a ramp or lag of the setpoint lasts at least
FASTEST, SLOWEST = 0.01, 0.995  # poles

# The gains of a structure, in one of these forms, of these kinds (summed or not).
Solve: TypeAlias = Callable[[Structure, Iterable[str], tuple[bool, ...]], Law | None]


@dataclass(frozen=True, slots=True, eq=False)
class Slopes:
    """jacobian (parameters, n): the gains, then those of pole and shape that the structure has; left (n,), in runs."""

    jacobian: Floats
    left: Floats
    free: tuple[str, ...]
    runs: tuple[int, ...]


def slopes(spans: tuple[Answers, ...], law: Law) -> Slopes:
    """What the command's rows are left with, and how that moves with each parameter."""

    def explained(structure: Structure) -> tuple[Floats, Floats, tuple[int, ...]]:
        found = moves(spans, structure)
        found = found.summed() if law.summed else found
        return parts(law.form, found.columns), found.command, tuple(n + law.summed for n in found.lengths)

    gains = np.array(law.gains)
    rows, command, runs = explained(law.structure)
    jacobian, free = [rows], []
    at = law.structure
    for name, there, step, moved in (
        ("pole", at.filter_on, NUDGE, replace(at, pole=at.pole + NUDGE)),
        ("shape", at.shaping, NUDGE * at.shape, replace(at, shape=at.shape * (1.0 + NUDGE))),
    ):
        if there != "none":
            jacobian.append((gains @ (explained(moved)[0] - rows) / step)[None])
            free.append(name)
    return Slopes(np.vstack(jacobian), command - gains @ rows, tuple(free), runs)


def polish(spans: tuple[Answers, ...], law: Law | None, fitted: Solve, settled: float = SETTLED) -> Law | None:
    """The nearest minimum in pole and shape; `fitted` solves the gains of a structure."""
    if law is None:
        return None
    limit = shortest(spans, law.structure)
    for _ in range(ROUNDS):
        at = slopes(spans, law)
        size = np.sqrt(np.sum(at.jacobian**2, axis=1))
        size[size == 0.0] = 1.0
        step = np.linalg.lstsq((at.jacobian / size[:, None]).T, at.left, rcond=1e-12)[0] / size
        ahead = None
        for halving in range(HALVINGS):
            structure = _moved(law.structure, at.free, 0.5**halving * step[-len(at.free) :], limit)
            trial = fitted(structure, (law.form,), (law.summed,))
            if trial is not None and trial.left < law.left:
                ahead = trial
                break
        if ahead is None:
            break
        fall, law = 1.0 - ahead.left / law.left, ahead
        if fall < settled:
            break
    return law


def _moved(structure: Structure, free: tuple[str, ...], step: Floats, limit: float) -> Structure:
    """After a step, within what can be told from no filter at all and from an integrator."""
    pole, shape = structure.pole, structure.shape
    for name, by in zip(free, step.tolist(), strict=True):
        if name == "pole":
            pole = float(np.clip(pole + np.clip(by, -0.2, 0.2), FASTEST, SLOWEST))
        else:
            shape *= float(np.exp(np.clip(by / shape, -0.7, 0.7)))
            shape = max(shape, limit) if structure.shaping == "lag" else min(shape, limit)
    return replace(structure, pole=pole, shape=shape)


def shortest(spans: tuple[Answers, ...], structure: Structure) -> float:
    """The quickest shaping of the setpoint that is not one of no more than a row: a lag, s, or a ramp, per s."""
    time = QUICKEST * spans[0].step
    if structure.shaping == "lag":
        return time
    return max(float(np.abs(np.diff(s.setpoints[0])).max()) for s in spans) / time
