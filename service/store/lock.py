"""The lock on a data folder: one service at a time works in it.

Two processes that write or checkpoint one SQLite file at once can corrupt it before SQLite 3.51.3 (the WAL-reset
bug), and a service that starts takes up at once what its predecessor left behind. The lock is the system's: it
ends with its process, however that ends.
"""

from __future__ import annotations

import os
import sys
from pathlib import Path

from service.errors import ProblemError


def hold(folder: Path) -> int:
    """Lock a folder; the answer is the open file that holds the lock until it is closed.

    Raises ProblemError: data-in-use.
    """
    descriptor = os.open(folder / "lock", os.O_RDWR | os.O_CREAT, 0o600)
    try:
        _lock(descriptor)
    except OSError as error:
        os.close(descriptor)
        raise ProblemError(
            "data-in-use",
            f"Another gainwright service works in {folder}. Stop it, or set GAINWRIGHT_DATA_DIR to another folder.",
        ) from error
    return descriptor


def _lock(descriptor: int) -> None:
    if sys.platform == "win32":
        import msvcrt

        msvcrt.locking(descriptor, msvcrt.LK_NBLCK, 1)
    else:
        import fcntl

        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
