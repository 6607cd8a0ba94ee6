"""One BLAS thread per process: the work is spread over processes, and threads beside them only fight."""

from __future__ import annotations

import os

VARIABLES = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS")


def one_blas_thread() -> None:
    """Set the limit for this process and its children; it must come before numpy is imported.

    Two threads on two busy cores took 7 to 40 times as long for small matrices, and the order of summation,
    hence the last digit of a report, may depend on the number of threads.
    """
    for name in VARIABLES:
        os.environ[name] = "1"
