"""What ARX costs, in passes of a one-pole filter over the same record, and beside sippy-unipi.

    python -m tests.benchmarks.bench_arx

Ratios only: both sides are measured in the same run, in processor time, the least of several repetitions. sippy-unipi
is timed on nine of the 336 orders and delays of the search, spread over it, and scaled by 336/9; its own loop adds
more to that than nothing.
"""

from __future__ import annotations

import time
import warnings
from collections.abc import Callable

import numpy as np
from scipy.signal import lfilter

import ident
from ident.estimate.arx import fit_arx
from ident.estimate.lagged import even_runs
from ident.estimate.orders import MOST_A, MOST_B, MOST_DELAY, search_orders
from ident.judge.crosscheck import REACH, cross_check
from ident.judge.high_order import high_order
from ident.plants.arx import Arx

ROWS, H = 10_000, 0.01
PLANT = Arx([-1.7, 0.72], [0.02, 0.03], 5, H)
TIMED = [(na, nb, delay) for na, nb in ((1, 1), (2, 3), (4, 4)) for delay in (1, 11, 21)]


def cost(call: Callable[[], object], repeat: int = 5, number: int = 5) -> float:
    """Least processor time of a call, s."""
    call()
    least = np.inf
    for _ in range(repeat):
        start = time.process_time()
        for _ in range(number):
            call()
        least = min(least, (time.process_time() - start) / number)
    return least


def record(rows: int) -> ident.LoopRecord:
    rng = np.random.default_rng(0)
    u = np.repeat(rng.choice([-1.0, 1.0], rows // 20), 20)
    y = PLANT.simulate(u) + lfilter([1.0], [1.0, *PLANT.a], 0.01 * rng.standard_normal(rows))
    return ident.LoopRecord(H * np.arange(rows), u, y)


def sippy(log: ident.LoopRecord) -> float:
    """Processor time of the whole search with sippy-unipi, s, scaled from a few of its orders."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        import sippy_unipi

        def identify(orders: tuple[int, int, int]) -> None:
            na, nb, delay = orders
            sippy_unipi.system_identification(
                log.speed, log.command, "ARX", centering="MeanVal", ARX_orders=[na, nb, delay - 1], tsample=H
            )

        total = sum(cost(lambda o=orders: identify(o), 1, 1) for orders in TIMED)
    return total * MOST_A * MOST_B * MOST_DELAY / len(TIMED)


def main() -> None:
    log = record(ROWS)
    runs = even_runs(log)
    fopdt = ident.fit(log, "fopdt")
    one_pass = cost(lambda: lfilter([0.0, 0.1], [1.0, -0.9], log.command), 20, 20)
    search, whole = cost(lambda: search_orders(runs)), cost(lambda: fit_arx(log))
    print(f"{ROWS} rows; costs in one-pole passes over the record")
    print(f"  search of {MOST_A * MOST_B * MOST_DELAY} orders and delays      {search / one_pass:8.0f}")
    print(f"  complete fit with search (bar 150)      {whole / one_pass:8.0f}")
    print(f"  complete fit at given orders            {cost(lambda: fit_arx(log, (2, 2, 5))) / one_pass:8.0f}")
    print(f"  high-order ARX, 20 + {REACH} terms           {cost(lambda: high_order(runs, 20, REACH)) / one_pass:8.0f}")
    check = cost(lambda: cross_check(log, fopdt, subspace=False))
    print(f"  cross-check without subspace (bar 150)  {check / one_pass:8.0f}")
    theirs = sippy(log)
    print("sippy-unipi over the same orders, scaled from nine of them (bar 1000)")
    print(f"  over the search                         {theirs / search:8.0f}")
    print(f"  over the complete fit                   {theirs / whole:8.0f}")
    long = record(100 * ROWS)
    growth = cost(lambda: fit_arx(long), 1, 1) / whole / 100
    print(f"1,000,000 rows over 100 times 10,000 (bar 1.3)  {growth:5.2f}")


if __name__ == "__main__":
    main()
