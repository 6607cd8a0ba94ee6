"""How a worker process is made: from which kind of parent, and what it does before its first log."""

from __future__ import annotations

import multiprocessing
import os
import signal
import sys
import threading
from multiprocessing.connection import wait
from multiprocessing.context import BaseContext

from service.work.stages import Stage, tell
from service.work.threads import one_blas_thread

PRELOAD = ["service.work.report"]  # brings ident, scipy and pandas with it


def context() -> BaseContext:
    """A fork server with the numerics loaded on Linux (a new worker in 0.01 s), else spawn (2 to 3 s).

    The server starts loading at once, in a process of its own: call this before whatever else takes time.
    """
    one_blas_thread()
    if sys.platform != "linux":
        return multiprocessing.get_context("spawn")
    from multiprocessing import forkserver  # not on every system

    chosen = multiprocessing.get_context("forkserver")
    chosen.set_forkserver_preload(PRELOAD)
    forkserver.ensure_running()
    return chosen


def prepare(stage: Stage) -> None:
    """Initializer of every worker; `stage` is where it tells how far it is."""
    tell(stage)
    # Ctrl-C reaches the whole process group; the service alone decides when workers stop.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    # A service killed outright leaves its workers waiting for ever unless they watch it.
    threading.Thread(target=_end_with_parent, daemon=True, name="end-with-parent").start()


def _end_with_parent() -> None:
    parent = multiprocessing.parent_process()
    if parent is not None:
        wait([parent.sentinel])
        os._exit(1)
