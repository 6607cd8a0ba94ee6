"""Closed loops that nobody moves: does a model or a tuning ever come out?  python -m tests.benchmarks.excitation [RUNS]

PI and PID loops around drawn plants, disturbed by load and measurement noise alone
(tests/reference/closed_loop.py), some with a coarsely written command; 2,000 to 20,000 rows. The bar:
never a model, advice every time.
"""

from __future__ import annotations

import sys
from collections import Counter

import numpy as np

import ident
from tests.reference.closed_loop import SUBSTEPS, Loop, simulate


def drawn(rng: np.random.Generator) -> Loop:
    T = np.exp(rng.uniform(-1.0, 1.5))
    h = T * rng.choice([0.02, 0.05, 0.1])
    L = max(round(rng.uniform(0.1, 0.6) * T / (h / SUBSTEPS)), 1) * h / SUBSTEPS
    K = np.exp(rng.uniform(-1.0, 4.0))
    Td = float(rng.choice([0.0, rng.uniform(0.1, 0.4)]) * L)
    return Loop(
        K,
        T,
        L,
        h,
        int(rng.choice([2000, 2000, 5000, 20_000])),
        Kp=T / (K * 2.0 * L) * rng.uniform(0.4, 1.3),
        Ti=T * rng.uniform(0.6, 1.5),
        noise=rng.uniform(0.0, 0.3),
        load=rng.uniform(0.1, 1.0) / K,
        load_time=T * np.exp(rng.uniform(-3.0, 3.0)),
        setpoint_half_period=1e9,
        Td=Td,
    )


def main(runs: int) -> None:
    rng = np.random.default_rng(0)
    seen: Counter[str] = Counter()
    for run in range(runs):
        loop = drawn(rng)
        form = "PID" if loop.Td else "PI"
        time, command, speed, setpoint = next(iter(simulate(loop, 1, seed=run)))
        if rng.random() < 0.3:
            step = np.ptp(command) / rng.choice([20, 100, 500])
            command = np.round(command / step) * step
        if not np.isfinite(speed).all() or np.abs(speed).max() > 1e6:
            seen["unstable, left out"] += 1
            continue
        seen[form] += 1
        report = ident.analyse(ident.LoopRecord(time, command, speed, setpoint), subspace=False)
        seen["model"] += bool(report.fits)
        seen["tuning"] += bool(report.tunings)
        seen["advice"] += report.record.advice is not None
        seen["designed test"] += report.record.advice is not None and report.record.advice.size is not None
    print(f"{runs} runs: " + ", ".join(f"{name} {count}" for name, count in seen.items()))


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1000)
