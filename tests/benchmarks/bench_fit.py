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


def records(rows: int = ROWS) -> dict[str, ident.LoopRecord]:
    rng = np.random.default_rng(1)
    commands = {
        "one step": np.where(np.arange(rows) < rows // 10, 0.0, 1.0),
        "random binary, 25 rows a bit": np.repeat(rng.choice([-1.0, 1.0], rows // 25), 25),
        "random binary, every row": rng.choice([-1.0, 1.0], rows),
    }
    t = H * np.arange(rows)
    return {
        name: ident.LoopRecord(t, u, respond(u, H, K, T, L) + SIGMA * rng.standard_normal(rows))
        for name, u in commands.items()
    }


def graphical(record: ident.LoopRecord) -> tuple[float, float, float, float]:
    """(K, T, L, offset) read off one step where it has gone 28.3 and 63.2 % of its way (Smith 1972, Digital Computer
    Process Control)."""
    at = int(np.flatnonzero(np.diff(record.command))[0]) + 1
    before, after = record.speed[:at].mean(), record.speed[-ROWS // 2 :].mean()
    # Read off a line drawn through the noise.
    drawn = np.convolve(record.speed[at:], np.full(9, 1.0 / 9.0), "same")
    early, late = (H * int(np.argmax(drawn > before + share * (after - before))) for share in (0.283, 0.632))
    lag = 1.5 * (late - early)
    return float(after - before), lag, max(late - lag, 0.0), float(before)


def general_purpose(record: ident.LoopRecord, start: tuple[float, float, float, float]) -> None:
    """The same fit by scipy.optimize.curve_fit over scipy.signal.lsim."""
    t, u = record.time, record.command

    def simulate(_: object, k: float, lag: float, delay: float, offset: float) -> np.ndarray:
        late = np.interp(t - delay, t, u)
        return offset + lsim(([k], [lag, 1.0]), late, t)[1]

    curve_fit(simulate, t, record.speed, p0=start)


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
    growth()
    everyday()


def growth() -> None:
    print("cost of a fopdt fit of 1,000,000 rows over 100 times that of 10,000 (bar 1.3):")
    usual = records()
    for name, longer in records(1_000_000).items():
        ours = cost(lambda r=usual[name]: ident.fit(r, "fopdt"))
        print(f"  {name:30} {cost(lambda r=longer: ident.fit(r, 'fopdt'), repeat=2, number=1) / (100 * ours):.2f}")


def everyday() -> None:
    print("curve_fit with lsim over ident.fit (bar 300):")
    step, binary = (records()[name] for name in ("one step", "random binary, 25 rows a bit"))
    near = (1.5, 0.4, 0.08, 0.0)
    for name, record, start in (
        ("one step, from its graph", step, graphical(step)),
        ("one step, from near the truth", step, near),
        ("random binary, near the truth", binary, near),
    ):
        reference = cost(lambda r=record, p=start: general_purpose(r, p), repeat=2, number=1)
        print(f"  {name:30} {reference / cost(lambda r=record: ident.fit(r, 'fopdt')):.0f}")


if __name__ == "__main__":
    main()
