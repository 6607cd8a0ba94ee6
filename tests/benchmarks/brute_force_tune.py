"""500 random plants: the settings found against brute force on the same problem, written by another hand.

Run once, it takes long: python -m tests.benchmarks.brute_force_tune COUNT > tests/reference/brute_force_tune.csv.
Brute force knows nothing of ellipses: a random cloud over log Kp, log ki (and log Td) that shrinks about its best
member, with Ms, Mt and the turn count on a grid of 1,500 frequencies and a plant written here. Columns: the plant
(gain, lags, dead time), form, target, the best ki either way and their ratio (found over brute force: below 1 the
search missed something), and the largest of Ms and Mt of the settings found on the grid used here.
"""

from __future__ import annotations

import csv
import sys
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

import ident

Floats = NDArray[np.float64]
CLOUD, ROUNDS, KEPT = 600, 13, 3


@dataclass(frozen=True)
class Lags:
    """K exp(-L s)/((T1 s + 1)(T2 s + 1)...), the brute force's own plant."""

    K: float
    T: tuple[float, ...]
    L: float

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        s = 1j * np.asarray(w)
        response = self.K * np.exp(-self.L * s)
        for T in self.T:
            response = response / (1.0 + T * s)
        return np.asarray(response)


def random_plant(rng: np.random.Generator) -> Lags:
    lags = tuple(float(10 ** rng.uniform(-1.5, 0.5)) for _ in range(int(rng.integers(1, 5))))
    return Lags(float(rng.choice([-1.0, 1.0]) * 10 ** rng.uniform(-2, 3)), lags, float(10 ** rng.uniform(-1.5, 0.7)))


def grid_of(plant: Lags) -> tuple[Floats, NDArray[np.complex128]]:
    scale = plant.L + sum(plant.T)
    w = np.geomspace(1e-3 / scale, 60.0 / plant.L, 1500)
    return w, plant.frequency_response(w) / plant.K


def worst(w: Floats, response: NDArray[np.complex128], x: Floats) -> Floats:
    """max(Ms, Mt) of each row log (Kp, ki[, Td]); inf where unstable."""
    s = 1j * w
    found = np.empty(len(x))
    for start in range(0, len(x), 200):
        z = np.exp(x[start : start + 200])
        Td = z[:, 2:3] if x.shape[1] == 3 else np.zeros((len(z), 1))
        slow = 1.0 + s * Td / 10 + (s * Td / 10) ** 2 / 2
        loop = response * (z[:, :1] * (1 + s * Td) + z[:, 1:2] / s) / slow
        back = 1.0 + loop
        turned = np.sum(np.angle(back[:, 1:] / back[:, :-1]), axis=1)
        S = 1.0 / np.abs(back)
        # Stable: 1 + L turns from -90 degrees to 0, and 1 + L comes to rest.
        stable = (np.abs(turned - np.pi / 2) < 0.5) & (np.abs(loop[:, -1]) < 1.0)
        found[start : start + 200] = np.where(stable, np.maximum(S.max(1), (np.abs(loop) * S).max(1)), np.inf)
    return found


def brute_force(plant: Lags, form: str, M: float, rng: np.random.Generator) -> float:
    w, response = grid_of(plant)
    scale = plant.L + sum(plant.T)
    low = np.log([0.02, 0.02 / scale, 0.003 * scale])[: 3 if form == "pid" else 2]
    high = np.log([30.0 * (1 + sum(plant.T) / plant.L), 300.0 * (1 + sum(plant.T) / plant.L) / scale, scale])
    high = high[: len(low)]
    centres, width = np.array([(low + high) / 2]), (high - low) / 2
    best, best_x = 0.0, None
    for _ in range(ROUNDS):
        x = np.concatenate([c + rng.uniform(-1, 1, (CLOUD // len(centres), len(low))) * width for c in centres])
        if form == "pid":
            x[:, 2] = np.minimum(x[:, 2], np.log(scale))
        good = np.flatnonzero(worst(w, response, x) <= M)
        good = good[np.argsort(-x[good, 1])][:KEPT]
        if len(good) and np.exp(x[good[0], 1]) > best:
            best, best_x = float(np.exp(x[good[0], 1])), x[good[0]]
        if len(good):
            assert best_x is not None
            centres = np.array([best_x, *x[good]])
            width = width * 0.6
    return best / abs(plant.K)


def compare(plant: Lags, form: str, M: float, rng: np.random.Generator) -> tuple[float, float, float]:
    """ki found, ki of brute force, max(Ms, Mt) of what was found."""
    s = ident.tune(plant, Ms=M, form=form).settings
    w, response = grid_of(plant)
    free = (
        np.log([abs(s.Kp), s.ki] + ([s.Td] if s.Td > 0 else []))
        + np.log(abs(plant.K)) * np.array([1, 1, 0])[: 3 if s.Td > 0 else 2]
    )
    return s.ki, brute_force(plant, form, M, rng), float(worst(w, response, np.array([free]))[0])


def main(count: int) -> None:
    out = csv.writer(sys.stdout)
    out.writerow(["seed", "K", "T", "L", "form", "M", "ki", "ki_brute", "ratio", "worst"])
    for seed in range(count):
        rng = np.random.default_rng([7, seed])
        plant, M = random_plant(rng), float(np.round(rng.uniform(1.3, 2.0), 3))
        form = "pid" if seed % 2 else "pi"
        ki, brute, reached = compare(plant, form, M, rng)
        lags = " ".join(f"{T:.9g}" for T in plant.T)
        row = [seed, f"{plant.K:.9g}", lags, f"{plant.L:.9g}", form, M, f"{ki:.7g}", f"{brute:.7g}"]
        out.writerow([*row, f"{ki / brute:.5f}", f"{reached:.5f}"])
        sys.stdout.flush()


if __name__ == "__main__":
    main(int(sys.argv[1]))
