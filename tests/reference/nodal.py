"""A tiny nodal solver for op-amp circuits: the independent reference for the card's formulas.

Kirchhoff's current law at every node, Y v = i, with each ideal op-amp as a nullor (one unknown output current, one
equation v+ = v-): Modified nodal analysis, Ho, Ruehli and Brennan, IEEE Trans. Circuits and Systems 22 (1975) 504.
"""

from __future__ import annotations

import numpy as np


def gain(
    s: complex,
    resistors: list[tuple[str, str, float]],
    capacitors: list[tuple[str, str, float]],
    opamps: list[tuple[str, str, str]],
    sources: dict[str, float],
    out: str,
) -> complex:
    """Voltage of node `out` with the named nodes driven; parts (node, node, value), op-amps (plus, minus, out)."""
    pairs = [(a, b, 1.0 / r) for a, b, r in resistors] + [(a, b, s * c) for a, b, c in capacitors]
    names = {n for a, b, _ in pairs for n in (a, b)} | {n for o in opamps for n in o} | set(sources)
    index = {n: i for i, n in enumerate(sorted(names - {"0"}))}
    extra = len(opamps) + len(sources)
    n = len(index)
    A = np.zeros((n + extra, n + extra), dtype=complex)
    rhs = np.zeros(n + extra, dtype=complex)
    for a, b, y in pairs:
        for p, q in ((a, b), (b, a)):
            if p != "0":
                A[index[p], index[p]] += y
                if q != "0":
                    A[index[p], index[q]] -= y
    for k, (plus, minus, output) in enumerate(opamps):
        A[index[output], n + k] = 1.0
        for node, sign in ((plus, 1.0), (minus, -1.0)):
            if node != "0":
                A[n + k, index[node]] += sign
    for k, (node, volts) in enumerate(sources.items(), start=len(opamps)):
        A[index[node], n + k] = 1.0
        A[n + k, index[node]] = 1.0
        rhs[n + k] = volts
    scale = np.abs(A).max(axis=1)
    return complex(np.linalg.solve(A / scale[:, None], rhs / scale)[index[out]])
