"""What tuning costs: evaluations of a 400-point frequency response, and time beside a plain scipy optimisation.

Run: python tests/benchmarks/bench_tune.py. The plain solution is what one would write in an afternoon:
scipy.optimize.minimize (SLSQP, finite differences) over log Kp, log Ti with Ms and Mt on a 400-point grid. It
meets its limit only on that grid and is handed a good start. Bars: 300 evaluations for PI, 2,000 for PID.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import numpy as np
from scipy.optimize import minimize

from ident import Fopdt, margins, tune
from ident.loop.held_plant import held_plant
from ident.tune.band import find_band
from ident.tune.iae import find_iae

POINTS = 400


class Counting:
    """A first-order plant that counts the points it is asked for."""

    def __init__(self, plant: Fopdt) -> None:
        self.plant, self.points, self.dead_time = plant, 0, plant.L

    def frequency_response(self, w: Any) -> Any:
        self.points += np.size(w)
        return self.plant.frequency_response(w)


def plain(plant: Counting, Ms: float) -> float:
    delay = plant.dead_time
    w = np.geomspace(0.01 / delay, 30 / delay, POINTS)

    def worst(x: Any) -> float:
        Kp, Ti = np.exp(x)
        loop = plant.frequency_response(w) * Kp * (1 + 1 / (1j * w * Ti))
        return float(max(np.max(1 / np.abs(1 + loop)), np.max(np.abs(loop / (1 + loop)))))

    start = np.log([0.3 * plant.plant.T / delay, min(plant.plant.T, 8 * delay)])
    limit = {"type": "ineq", "fun": lambda x: Ms - worst(x)}
    found = minimize(lambda x: x[1] - x[0], start, method="SLSQP", constraints=limit)
    return float(np.exp(found.x[0] - found.x[1]))


def plain_iae(plant: Counting, Ms: float) -> float:
    """The same afternoon's work for the least IAE; the IAE it reaches over the one that `tune` finds."""
    delay = plant.dead_time
    w = np.geomspace(0.01 / delay, 30 / delay, POINTS)
    found = tune(plant.plant, Ms=Ms, goal="load").settings
    objective = find_iae(find_band(held_plant(plant.plant), "pi"), found, "load", 10.0)

    def worst(x: Any) -> float:
        loop = plant.frequency_response(w) * (np.exp(x[0]) + np.exp(x[1]) / (1j * w))
        return float(max(np.max(1 / np.abs(1 + loop)), np.max(np.abs(loop / (1 + loop)))))

    def iae(x: Any) -> float:
        plant.points += len(objective.window.w)
        return objective(x)[0]

    start = np.log([0.3 * plant.plant.T / delay, 0.3 * plant.plant.T / delay / min(plant.plant.T, 8 * delay)])
    limit = {"type": "ineq", "fun": lambda x: Ms - worst(x)}
    reached = minimize(iae, start, method="SLSQP", constraints=limit)
    return float(np.exp(reached.fun - objective(np.log([found.Kp, found.ki]))[0]))


def least(run: Callable[[], Any], rounds: int = 5) -> float:
    times = []
    for _ in range(rounds):
        start = time.process_time()
        run()
        times.append(time.process_time() - start)
    return min(times)


def main() -> None:
    print(f"{'L/T':>6} {'PI evals':>9} {'PID evals':>10} {'plain evals':>12} {'PI/plain time':>14} {'plain ki/ki':>12}")
    for L in (0.05, 0.2, 1.0, 5.0):
        bare = Fopdt(1.0, 1.0, L)
        counts, ki = [], 0.0
        for form in ("pi", "pid"):
            plant = Counting(bare)
            found = tune(plant, form=form)
            counts.append(plant.points / POINTS)
            ki = found.settings.ki if form == "pi" else ki
        reference = Counting(bare)
        ratio = plain(reference, 1.6) / ki
        cost = least(lambda p=bare: tune(Counting(p))) / least(lambda p=bare: plain(Counting(p), 1.6))
        print(
            f"{L:6.2f} {counts[0]:9.0f} {counts[1]:10.0f} {reference.points / POINTS:12.0f} {cost:14.2f} {ratio:12.5f}"
        )
    print("least IAE after a load step (goal load), evaluations; plain: scipy SLSQP over the same FFT objective")
    for L in (0.05, 0.2, 1.0, 5.0):
        counts = []
        for form in ("pi", "pid"):
            plant = Counting(Fopdt(1.0, 1.0, L))
            tune(plant, form=form, goal="load")
            counts.append(plant.points / POINTS)
        reference = Counting(Fopdt(1.0, 1.0, L))
        ratio = plain_iae(reference, 1.6)
        print(
            f"{L:6.2f} {counts[0]:9.0f} {counts[1]:10.0f} {reference.points / POINTS:12.0f} {ratio:12.5f} plain IAE/IAE"
        )
    settings = tune(Fopdt(1, 1, 1)).settings
    plant = Counting(Fopdt(1, 1, 1))
    margins(plant, settings)
    print(f"margins of one loop: {plant.points / POINTS:.1f} evaluations")


if __name__ == "__main__":
    main()
