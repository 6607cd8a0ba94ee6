"""False alarms and found moves of `ident.drift` over simulated nights:  python -m tests.benchmarks.drift [SERIES]

Nights are simulated under PI with noise in the loop (tests/reference/nightly.py), fitted by `ident.fit` and compared
as a service would; nothing between the log and the verdict is left out. Seeded; 200 series take about half an hour.

The bar: at most 3 of 2000 moved, and 95 % found, for the plant that is fitted as what it is; no alarms for the others.
"""

from __future__ import annotations

import sys
import time
from collections import Counter
from collections.abc import Sequence

import numpy as np

import ident
from tests.reference.nightly import H, Loop, closed_loop, setpoints

NIGHTS = 10  # watched, in each series
SIGNIFICANCE = 0.001
SIZES = (15.0, 150.0)  # rpm, of the setpoint moves of a night
# s, how long a night holds a move on average: ordinary; unlike; and down to where the speed hardly answers in time
ORDINARY, UNLIKE, ANY = (6.0, 25.0), (4.0, 30.0), (2.0, 30.0)
BASELINES = (1, 3, 5)

# The loop, and the range of lengths its nights differ in. Time constants and noise in s and rpm.
PLANTS = {
    "FOPDT, noise 2": (Loop(), ORDINARY),
    "FOPDT, noise 6": (Loop(noise=6.0), ORDINARY),
    "SOPDT 1.5 and 0.6, noise 2": (Loop(T1=1.5, T2=0.6, L=0.3), ORDINARY),
    "SOPDT 1 and 1, noise 1": (Loop(T1=1.0, T2=1.0, L=0.2, noise=1.0), UNLIKE),
    "SOPDT 1 and 1, noise 0.5": (Loop(T1=1.0, T2=1.0, L=0.2, noise=0.5), ANY),
}


def nights_of(
    loop: Loop, holds: tuple[float, float], gain: np.ndarray, rng: np.random.Generator, rows: int = 800
) -> list[ident.Night | None]:
    """One fitted night for each entry of `gain`; None where the log does not carry a fit."""
    r = setpoints(rng, rows, len(gain), SIZES, holds)
    u, y = closed_loop(loop, r, rng, gain)
    t = H * np.arange(rows)
    found: list[ident.Night | None] = []
    for j in range(len(gain)):
        try:
            fit = ident.fit(ident.LoopRecord(t, u[:, j], y[:, j], r[:, j]), "fopdt")
            found.append(ident.Night.of(fit))
        except ident.IdentError:
            found.append(None)
    return found


def verdicts(baseline: Sequence[ident.Night | None], tonight: Sequence[ident.Night | None]) -> list[str]:
    """Verdict of each night, in order."""
    dated = [(f"{k:03d}", night) for k, night in enumerate(tonight)]
    history = ident.drift_history(
        [n for n in baseline if n is not None],
        dated,
        settings=ident.PidSettings(0.075, 2.3),
        period=H,
        significance=SIGNIFICANCE,
    )
    return [drift.verdict for _, drift in history]


def unchanged(loop: Loop, holds: tuple[float, float], base: int, series: int, seed: int) -> Counter[str]:
    """Verdicts of `series` times NIGHTS nights after a baseline of `base`, nothing changed."""
    rng = np.random.default_rng(seed)
    nights = nights_of(loop, holds, np.ones(series * (base + NIGHTS)), rng)
    said: Counter[str] = Counter()
    for i in range(series):
        own = nights[i * (base + NIGHTS) : (i + 1) * (base + NIGHTS)]
        said.update(verdicts(own[:base], own[base:]))
    return said


def found_within_two(loop: Loop, holds: tuple[float, float], base: int, series: int, seed: int, gain: float) -> float:
    """Share of series in which a gain step is called on the first or the second night after it."""
    rng = np.random.default_rng(seed)
    nights = nights_of(loop, holds, np.tile([1.0] * base + [gain] * 2, series), rng)
    called = 0
    for i in range(series):
        own = nights[i * (base + 2) : (i + 1) * (base + 2)]
        called += "moved" in verdicts(own[:base], own[base:])
    return called / series


def main(series: int) -> None:
    print(f"{series} series of {NIGHTS} nights, significance {SIGNIFICANCE}, 80 s of log a night at {H} s")
    print(f"{'plant':27s} baseline  moved no-news not-moved   found within two nights: gain +20 %  -17 %")
    for p, (name, (loop, holds)) in enumerate(PLANTS.items()):
        for base in BASELINES:
            start = time.perf_counter()
            said = unchanged(loop, holds, base, series, 1000 + 10 * p + base)
            up, down = (
                found_within_two(loop, holds, base, series, 2000 + 10 * p + base, gain) for gain in (1.2, 1 / 1.2)
            )
            print(
                f"{name:27s} {base:8d} {said['moved']:6d} {said['no-news']:7d} {said['not-moved']:9d}   "
                f"{100 * up:38.1f} {100 * down:6.1f}   ({time.perf_counter() - start:.0f} s)",
                flush=True,
            )


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 200)
