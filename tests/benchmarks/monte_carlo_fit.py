"""Errors of the fit against the Cramer-Rao bound, and coverage of its 95 % intervals, over many seeded logs.

python -m tests.benchmarks.monte_carlo_fit [RUNS]
"""

from __future__ import annotations

import sys

import numpy as np

import ident
from ident.estimate.columns import columns
from ident.estimate.first_order import FirstOrder
from ident.estimate.layout import lay_out
from tests.reference.closed_loop import Loop, simulate
from tests.reference.held_fopdt import respond

NAMES = ("K", "T", "L")


def open_loop(runs: int) -> None:
    """White noise, open loop; the bound has the fit's own nuisance parameters."""
    K, T, L, h, n = 2.0, 0.5, 0.105, 0.01, 500  # CHECKS.md section 5's plant
    commands = {
        "one step": np.where(np.arange(n) < 50, 0.0, 1.0),
        "random binary": np.repeat(np.random.default_rng(7).choice([-1.0, 1.0], n // 20), 20),
    }
    rng = np.random.default_rng(5)
    for name, u in commands.items():
        clean = respond(u, h, K, T, L)
        at = columns(lay_out(ident.LoopRecord(h * np.arange(n), u, clean)), FirstOrder(T), L)
        slopes = np.vstack((at.response, K * at.slopes[0] / T, K * at.slope_L, at.nuisance))
        for snr in (5, 20, 100):
            sigma = float(clean.std()) / snr
            bound = sigma * np.sqrt(np.diag(np.linalg.inv(slopes @ slopes.T)))[:3]
            logs = (ident.LoopRecord(h * np.arange(n), u, clean + sigma * rng.standard_normal(n)) for _ in range(runs))
            errors, inside = judge((K, T, L), logs)
            rms = np.sqrt(np.mean(np.square(errors), axis=0)) / bound
            show(f"open, {name}, S/N {snr}", f"rms/bound {rms.round(3)}", inside, len(errors), runs)


def closed_loop(runs: int) -> None:
    """PI loop, setpoint steps, slow load disturbance and white measurement noise."""
    cases = {
        "K 1.6 T 0.8 L 0.25": Loop(1.6, 0.8, 0.25, 0.05, 2000, Kp=0.8, Ti=0.9, noise=0.02, load=0.05, load_time=5.0),
        "K 2 T 1 L 0.3": Loop(2.0, 1.0, 0.3, 0.1, 1500, Kp=0.8, Ti=1.0, noise=0.01, load=0.1, load_time=20.0),
        "K 1.6, noisier, shorter": Loop(
            1.6, 0.8, 0.25, 0.05, 1000, Kp=0.8, Ti=0.9, noise=0.05, load=0.03, load_time=3.0
        ),
    }
    for name, loop in cases.items():
        logs = (ident.LoopRecord(*columns_of) for columns_of in simulate(loop, runs, seed=3))
        errors, inside = judge((loop.K, loop.T, loop.L), logs)
        bias = np.mean(errors, axis=0) / np.std(errors, axis=0)
        show(f"closed, {name}", f"bias/std  {bias.round(3)}", inside, len(errors), runs)


def judge(truth: tuple[float, ...], logs: object) -> tuple[list[list[float]], list[list[bool]]]:
    errors, inside = [], []
    for record in logs:  # type: ignore[attr-defined]
        try:
            fit = ident.fit(record, "fopdt")
        except ident.NotIdentifiable:
            continue
        found = [fit.parameters[name] for name in NAMES]
        errors.append([e.value - true for e, true in zip(found, truth, strict=True)])
        inside.append(
            [
                (e.ci95[0] is None or e.ci95[0] <= true) and (e.ci95[1] is None or true <= e.ci95[1])
                for e, true in zip(found, truth, strict=True)
            ]
        )
    return errors, inside


def show(name: str, figures: str, inside: list[list[bool]], fitted: int, runs: int) -> None:
    print(f"{name:36} {figures:34} cover {np.mean(inside, axis=0).round(3)}  {fitted}/{runs} fitted", flush=True)


def main() -> None:
    runs = int(sys.argv[1]) if len(sys.argv) > 1 else 1000
    print(f"{runs} runs a row; columns {', '.join(NAMES)}")
    open_loop(runs)
    closed_loop(runs)


if __name__ == "__main__":
    main()
