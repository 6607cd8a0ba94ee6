"""False alarms and found moves of `ident.drift` over simulated nights:  python -m tests.benchmarks.drift [SERIES]

Nights are simulated under PI with noise in the loop (tests/reference/nightly.py), fitted by `ident.fit` and compared
as a service would; nothing between the log and the verdict is left out. Seeded; about two minutes for 200 series.
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
ORDINARY = {"sizes": (15.0, 150.0), "holds": (6.0, 25.0)}  # rpm, s

PLANTS = {
    "first order, as fitted": Loop(),
    "first order, more noise": Loop(noise=6.0),
    "SOPDT 1.5 s, 0.6 s": Loop(T1=1.5, T2=0.6, L=0.3),
    "SOPDT 1 s, 1 s": Loop(T1=1.0, T2=1.0, L=0.2),
}


def nights_of(loop: Loop, rows: int, gain: np.ndarray, rng: np.random.Generator) -> list[ident.Night | None]:
    """One fitted night for each entry of `gain`; None where the log does not carry a fit."""
    r = setpoints(rng, rows, len(gain), **ORDINARY)
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


def unchanged(loop: Loop, base: int, series: int, rows: int, seed: int) -> Counter[str]:
    """Verdicts of `series` times NIGHTS nights after a baseline of `base`, nothing changed."""
    rng = np.random.default_rng(seed)
    nights = nights_of(loop, rows, np.ones(series * (base + NIGHTS)), rng)
    said: Counter[str] = Counter()
    for i in range(series):
        own = nights[i * (base + NIGHTS) : (i + 1) * (base + NIGHTS)]
        said.update(verdicts(own[:base], own[base:]))
    return said


def found_within_two(loop: Loop, base: int, series: int, rows: int, seed: int, gain: float) -> float:
    """Share of series in which a gain step is called on the first or the second night after it."""
    rng = np.random.default_rng(seed)
    nights = nights_of(loop, rows, np.tile([1.0] * base + [gain] * 2, series), rng)
    called = 0
    for i in range(series):
        own = nights[i * (base + 2) : (i + 1) * (base + 2)]
        called += "moved" in verdicts(own[:base], own[base:])
    return called / series


def main(series: int) -> None:
    print(f"{series} series of {NIGHTS} nights, significance {SIGNIFICANCE}, 80 s of log a night at {H} s")
    print(f"{'plant':26s} baseline   moved  no-news  of     found within two nights: gain +20 %  -20 %")
    for p, (name, loop) in enumerate(PLANTS.items()):
        for base in (1, 3, 5, 8):
            start = time.perf_counter()
            said = unchanged(loop, base, series, 800, 1000 + 10 * p + base)
            up, down = (
                found_within_two(loop, base, series, 800, 2000 + 10 * p + base, gain) for gain in (1.2, 1 / 1.2)
            )
            print(
                f"{name:26s} {base:5d}      {said['moved']:5d} {said['no-news']:8d}  {said.total():5d} "
                f"{100 * up:42.1f} {100 * down:6.1f}     ({time.perf_counter() - start:.0f} s)",
                flush=True,
            )


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 200)
