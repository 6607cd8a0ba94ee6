"""Dry friction in simulated motors that turn both ways: is it found where there is some, and only there?

    python -m tests.benchmarks.friction [RUNS]

With friction: errors and coverage of K, T and the level. Without: how often it is claimed all the same. The motors are
exact solutions of their own (tests/reference/dry_friction.py) or of scipy.signal.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import cont2discrete, lfilter

import ident
from tests.reference.dry_friction import respond

Floats = NDArray[np.float64]

H, ROWS = 0.02, 4000
K, T, L = 2.0, 0.8, 0.107


@dataclass(frozen=True)
class Case:
    name: str
    levels: bool  # the command takes any level, else +-1
    forward: float
    backward: float
    noise: float  # std over that of the speed


WITH = (
    Case("any level, 0.3", True, 0.3, 0.3, 0.02),
    Case("any level, 0.3, noisier", True, 0.3, 0.3, 0.1),
    Case("any level, 0.35 and 0.25", True, 0.35, 0.25, 0.05),
    Case("any level, 0.5", True, 0.5, 0.5, 0.05),
    Case("two levels, 0.4", False, 0.4, 0.4, 0.02),
    Case("two levels, 0.5, noisier", False, 0.5, 0.5, 0.1),
)


def command(rng: np.random.Generator, levels: bool) -> Floats:
    """Held for half a time constant to three of them, both signs; a quiet start."""
    u = np.zeros(ROWS)
    row = 10
    while row < ROWS:
        held = int(rng.uniform(0.5, 3.0) * T / H) + 1
        u[row : row + held] = rng.uniform(-1.2, 1.2) if levels else rng.choice([-1.0, 1.0])
        row += held
    return u


def record(speed: Floats, u: Floats, noise: float, rng: np.random.Generator) -> ident.LoopRecord:
    measured = speed + noise * speed.std() * rng.standard_normal(len(speed))
    return ident.LoopRecord(H * np.arange(len(u)), u, measured, speed_unit="rpm", command_unit="V")


def linear(u: Floats, lags: tuple[float, ...]) -> Floats:
    """K in series with lags and the dead time of whole samples nearest to L."""
    denominator = np.array([1.0])
    for lag in lags:
        denominator = np.polymul(denominator, [lag, 1.0])
    b, a, _ = cont2discrete(([K], denominator), H, method="zoh")
    delay = round(L / H)
    return np.asarray(lfilter(b.reshape(-1), a, np.concatenate((np.full(delay, u[0]), u[:-delay]))))


WITHOUT = {
    "first order": lambda u: linear(u, (T,)),
    "lags of 0.8 and 0.2": lambda u: linear(u, (T, 0.2)),
    "lags of 0.5 and 0.5": lambda u: linear(u, (0.5, 0.5)),
    "three lags of 0.3": lambda u: linear(u, (0.3, 0.3, 0.3)),
    "gain compression": lambda u: linear(np.tanh(1.5 * u) / 1.5, (T,)),
}


def main() -> None:
    runs = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    print(f"{runs} runs a row; errors in percent: mean (95th percentile of the size); coverage of 95 % intervals")
    for case in WITH:
        _with_friction(case, runs)
    for name, plant in WITHOUT.items():
        claimed = varies = 0
        for seed in range(runs):
            rng = np.random.default_rng(seed)
            u = command(rng, True)
            fit = ident.fit(record(plant(u), u, 0.05, rng))
            claimed += fit.friction is not None
            varies += any(f.code == "gain-varies-with-level" for f in fit.findings)
        print(f"{name:28s} friction claimed {claimed} of {runs}, a varying gain {varies}")


def _with_friction(case: Case, runs: int) -> None:
    errors, inside, gains = [], [], []
    for seed in range(runs):
        rng = np.random.default_rng(seed)
        u = command(rng, case.levels)
        log = record(respond(u, H, K, T, L, case.forward, case.backward), u, case.noise, rng)
        fit = ident.fit(log)
        if fit.friction is None or fit.name != "fopdt":
            continue
        found = (fit.parameters["K"], fit.parameters["T"], fit.friction.forward, fit.friction.backward)
        truth = (K, T, case.forward, case.backward)
        errors.append([100.0 * (e.value / true - 1.0) for e, true in zip(found, truth, strict=True)])
        inside.append([e.ci95[0] <= true <= e.ci95[1] for e, true in zip(found, truth, strict=True)])
        gains.append(_linear_gain(log))
    e, cover = np.array(errors), 100.0 * np.mean(inside, axis=0)
    said = "  ".join(
        f"{name} {e[:, i].mean():+.2f} ({np.quantile(np.abs(e[:, i]), 0.95):.2f}), {cover[i]:.1f} %"
        for i, name in enumerate(("K", "T", "forward", "backward"))
    )
    print(
        f"{case.name:28s} found {len(errors)}: {said}; a linear gain would be {np.mean(gains) / K:.2f} of the true one"
    )


def _linear_gain(log: ident.LoopRecord) -> float:
    """Ordinary least squares of a first-order difference equation at the true dead time."""
    y, u, d = log.speed, log.command, round(L / H)
    rows = np.stack((y[d:-1], u[: -1 - d], np.ones(len(y) - 1 - d)), axis=1)
    a, b, _ = np.linalg.lstsq(rows, y[d + 1 :], rcond=None)[0]
    return float(b / (1.0 - a))


if __name__ == "__main__":
    main()
