"""What read_csv costs beside pandas' C engine with time parsing on the same clean 86,400 x 4 log.

Run: python tests/benchmarks/bench_read_csv.py. Ratios only: both run in turn, in CPU time, the least of a few rounds.
"""

from __future__ import annotations

import io
import re
import time
from collections.abc import Callable

import numpy as np
import pandas as pd

from ident import read_csv

ROWS = 86_400


def clean_log() -> bytes:
    rng = np.random.default_rng(1)
    stamps = pd.date_range("2026-03-02", periods=ROWS, freq="100ms", tz="UTC").strftime("%Y-%m-%dT%H:%M:%S.%f")
    command, speed = rng.normal(30, 1, ROWS).round(2), rng.normal(900, 1, ROWS).round(1)
    table = pd.DataFrame({"Time": stamps.str[:-3] + "Z", "SP": 900.0, "CO": command, "PV": speed})
    return table.to_csv(index=False).encode()


def variants(clean: bytes) -> dict[str, bytes]:
    german = clean.replace(b",", b";").replace(b".", b",").replace(b"Z", b"")
    lines = clean.split(b"\n")
    lines[500] = lines[500].rsplit(b",", 1)[0] + b",Bad"
    elapsed = (b"%.1f%b" % (k / 10, line[line.index(b",") :]) for k, line in enumerate(clean.split(b"\n")[1:-1]))
    return {
        "clean ISO 8601": clean,
        "dd.mm.yyyy, decimal commas": re.sub(rb"(\d{4})-(\d\d)-(\d\d)T", rb"\3.\2.\1 ", german),
        "one state word": b"\n".join(lines),
        "thousands and units in cells": re.sub(rb",(\d)(\d\d\.\d)\n", rb',"\1,\1\2 rpm"\n', clean),
        "elapsed seconds": b"\n".join((b"Time,SP,CO,PV", *elapsed)),
    }


def cost(task: Callable[[], object]) -> float:
    begin = time.process_time()
    task()
    return time.process_time() - begin


def main(rounds: int = 8) -> dict[str, float]:
    clean = clean_log()
    logs = variants(clean)
    reference = [cost(lambda: pd.read_csv(io.BytesIO(clean), parse_dates=["Time"])) for _ in range(rounds)]
    ratios = {}
    for name, text in logs.items():
        ratios[name] = min(cost(lambda text=text: read_csv(text)) for _ in range(rounds)) / min(reference)  # type: ignore[misc]
        print(f"read_csv, {name}: {ratios[name]:.2f} times pandas.read_csv with time parsing")
    return ratios


if __name__ == "__main__":
    main()
