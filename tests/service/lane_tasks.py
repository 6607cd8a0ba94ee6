"""What a worker may be made to do with a log in tests: importable, for the worker imports it by name."""

from __future__ import annotations

import os
import signal
import time
from pathlib import Path

from service.errors import Problem
from service.work.options import Options
from service.work.stages import enter


def obey(source: bytes | Path, options: Options) -> bytes | Problem:
    """Do what the body says; anything else comes back in capitals."""
    if isinstance(source, Path):
        source = source.read_bytes()
    if source == b"die":
        os.kill(os.getpid(), signal.SIGKILL)
    if source == b"hang":
        time.sleep(600)
    if source == b"fitting":
        enter("fitting")
        time.sleep(600)
    if source.startswith(b"wait"):
        time.sleep(0.5)
    if source == b"pid":
        return str(os.getpid()).encode()
    if source == b"threads":
        return os.environ["OPENBLAS_NUM_THREADS"].encode()
    if source == b"refuse":
        return Problem("refused-by-test", "The test asked for a refusal, and here it is.", {"Ms": options.Ms})
    return source.upper()
