"""What a fit costs, in passes of a one-pole filter over the same record, and beside a general-purpose fit.

    python -m tests.benchmarks.bench_fit

Ratios only: both sides are measured in the same run, in processor time, the least of several repetitions.
"""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np
from scipy.optimize import curve_fit
from scipy.signal import lfilter, lsim

import ident
from ident.estimate.diagnostics import statistics
from ident.estimate.ground import ground, with_noise
from tests.reference.held_fopdt import respond

ROWS, H = 10_000, 0.01
K, T, L, SIGMA = 2.0, 0.5, 0.1053, 0.1


def cost(call: Callable[[], object], repeat: int = 7, number: int = 10) -> float:
    """Least processor time of a call, s."""
    call()
    least = np.inf
    for _ in range(repeat):
        start = time.process_time()
        for _ in range(number):
            call()
        least = min(least, (time.process_time() - start) / number)
    return least


def records() -> dict[str, ident.LoopRecord]:
    rng = np.random.default_rng(1)
    commands = {
        "one step": np.where(np.arange(ROWS) < 1000, 0.0, 1.0),
        "random binary, 25 rows a bit": np.repeat(rng.choice([-1.0, 1.0], ROWS // 25), 25),
        "random binary, every row": rng.choice([-1.0, 1.0], ROWS),
    }
    t = H * np.arange(ROWS)
    return {
        name: ident.LoopRecord(t, u, respond(u, H, K, T, L) + SIGMA * rng.standard_normal(ROWS))
        for name, u in commands.items()
    }


def general_purpose(record: ident.LoopRecord) -> None:
    """The same fit by scipy.optimize.curve_fit over scipy.signal.lsim, started close to the truth."""
    t, u = record.time, record.command

    def simulate(_: object, k: float, lag: float, delay: float, offset: float) -> np.ndarray:
        late = np.interp(t - delay, t, u)
        return offset + lsim(([k], [lag, 1.0]), late, t)[1]

    curve_fit(simulate, t, record.speed, p0=(1.5, 0.4, 0.08, 0.0))


def residual_tests(record: ident.LoopRecord) -> float:
    """Processor time of what the fit spends on its residuals' tests, s."""
    base = ground(record)
    found = with_noise(base, base.first)
    return cost(lambda: statistics(found.layout, found.at, found.colour, None))


def main() -> None:
    print(f"{ROWS} rows; passes of scipy.signal.lfilter([0, b], [1, -a]) over the same rows")
    print("bars: fopdt 100, its residual tests 40 more; sopdt 250; analyse, subspace left out, 1,000")
    for name, record in records().items():
        one_pass = cost(lambda r=record: lfilter([0.0, 0.1], [1.0, -0.9], r.command), number=200)
        fopdt = cost(lambda r=record: ident.fit(r, "fopdt"))
        tests = residual_tests(record)
        sopdt = cost(lambda r=record: ident.fit(r, "sopdt"), repeat=3, number=3)
        whole = cost(lambda r=record: ident.analyse(r, period=H, subspace=False), repeat=3, number=2)
        print(
            f"  {name:30} fopdt {(fopdt - tests) / one_pass:5.0f} + {tests / one_pass:3.0f}   "
            f"sopdt {sopdt / one_pass:5.0f}   analyse {whole / one_pass:5.0f}"
        )
    record = records()["random binary, 25 rows a bit"]
    reference = cost(lambda: general_purpose(record), repeat=2, number=1)
    print(f"curve_fit with lsim over ident.fit: {reference / cost(lambda: ident.fit(record, 'fopdt')):.0f}")


if __name__ == "__main__":
    main()
