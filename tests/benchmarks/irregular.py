"""Logs off the grid: is the FOPDT behind them within its intervals?  python -m tests.benchmarks.irregular [RUNS]

A step-wise command, held, and the plant's exact answer on whatever axis the log has (tests/reference/held_fopdt.py on a
fine grid); jittered stamps, gaps, and a speed reported only when it has changed by a deadband. The bar: each of K, T, L
within its 95 % interval in 95 % of 200 runs. A deadband no larger than the noise chatters, and stays below the bar.
"""

from __future__ import annotations

import sys
from collections.abc import Callable

import numpy as np

import ident
from tests.reference.held_fopdt import respond

K, T, L, FINE, END = 2.0, 1.0, 0.3, 0.005, 100.0
CLOCK = FINE * np.arange(round(END / FINE))


def plant(rng: np.random.Generator, rows: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Command and speed on the fine grid: levels held for 2 to 8 s, changed at rows of the log."""
    changes = rows[
        np.searchsorted(CLOCK[rows], np.cumsum(rng.uniform(2.0, 8.0, 60)), side="right").clip(0, len(rows) - 1)
    ]
    level = np.searchsorted(changes, np.arange(len(CLOCK)), side="right")
    u = rng.choice([0.0, 1.0, 2.0], 61)[level]
    return u, respond(u, FINE, K, T, L, 5.0)


def jittered(rng: np.random.Generator) -> ident.LoopRecord:
    rows = np.cumsum(rng.integers(6, 15, len(CLOCK) // 10))
    rows = rows[rows < len(CLOCK)]
    u, y = plant(rng, rows)
    return ident.LoopRecord(CLOCK[rows], u[rows], y[rows] + 0.1 * rng.standard_normal(len(rows)))


def gapped(rng: np.random.Generator) -> ident.LoopRecord:
    rows = np.arange(0, len(CLOCK), 10)
    u, y = plant(rng, rows)
    keep = np.ones(len(rows), dtype=bool)
    for start in rng.choice(len(rows) - 200, 4, replace=False):
        keep[start : start + int(rng.integers(30, 150))] = False
    rows = rows[keep]
    return ident.LoopRecord(CLOCK[rows], u[rows], y[rows] + 0.1 * rng.standard_normal(len(rows)))


def on_change(rng: np.random.Generator, noise: float = 0.02, deadband: float = 0.1) -> ident.LoopRecord:
    """A 50 ms scan; a row is written where the command moved or the speed left a deadband, blanks are unchanged."""
    scanned = np.arange(0, len(CLOCK), 10)
    u, y = plant(rng, scanned)
    seen = y[scanned] + noise * rng.standard_normal(len(scanned))
    lines, last = ["time,command,speed"], np.inf
    for i, row in enumerate(scanned):
        moved = i == 0 or u[row] != u[scanned[i - 1]]
        told = abs(seen[i] - last) > deadband
        if moved or told:
            lines.append(f"{CLOCK[row]:.3f},{u[row] if moved else ''},{f'{seen[i]:.4f}' if told else ''}")
        last = seen[i] if told else last
    return ident.read_csv("\n".join(lines).encode())


KINDS: dict[str, Callable[[np.random.Generator], ident.LoopRecord]] = {
    "jittered": jittered,
    "gapped": gapped,
    "on change": on_change,
    "on change, wide deadband": lambda rng: on_change(rng, deadband=0.4),
    "on change, much noise": lambda rng: on_change(rng, noise=0.05),
    "on change, deadband of the noise's size": lambda rng: on_change(rng, deadband=0.02),
}


def covered(kind: str, runs: int) -> tuple[np.ndarray, int]:
    """Share of runs in which each of K, T, L lies within its interval, and how many logs gave a fit."""
    rng = np.random.default_rng(3)
    inside = []
    for _ in range(runs):
        record = KINDS[kind](rng)
        try:
            fit = ident.fit(record, "fopdt")
        except ident.IdentError:
            continue
        row = []
        for name, true in (("K", K), ("T", T), ("L", L)):
            low, high = fit.parameters[name].ci95
            row.append(low is not None and high is not None and low <= true <= high)
        inside.append(row)
    return np.mean(inside, axis=0), len(inside)


def main(runs: int) -> None:
    for kind in KINDS:
        share, fitted = covered(kind, runs)
        print(f"{kind:40} K {share[0]:.3f}  T {share[1]:.3f}  L {share[2]:.3f}   {fitted}/{runs} fitted", flush=True)


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 200)
