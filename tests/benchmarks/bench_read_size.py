"""What a long log costs: time per row beside a short one, memory beside the record's own arrays.

Run: python tests/benchmarks/bench_read_size.py [rows, 10,000,000 by default]. The log is written to a temporary file
and read from there in a process of its own, whose peak memory is the system's figure.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from ident import read_csv

CHUNK = 100_000
SHORT = 86_400


def write(path: Path, rows: int) -> None:
    """ISO 8601 stamps 0.1 s apart, setpoint, command, speed."""
    rng = np.random.default_rng(1)
    begin = np.datetime64("2026-03-02T00:00:00.000")
    with path.open("wb") as file:
        file.write(b"Time,SP,CO,PV\n")
        for first in range(0, rows, CHUNK):
            count = min(CHUNK, rows - first)
            stamps = np.datetime_as_string(begin + 100 * np.arange(first, first + count))
            command, speed = rng.normal(30, 1, count).round(2), rng.normal(900, 1, count).round(1)
            lines = (f"{t}Z,900.0,{u},{y}\n" for t, u, y in zip(stamps, command, speed, strict=True))
            file.write("".join(lines).encode())


def measure(path: Path) -> tuple[int, float, int]:
    """Rows, CPU s and peak bytes of reading a log in this process."""
    before = peak_bytes()
    begin = time.process_time()
    record = read_csv(path)
    spent = time.process_time() - begin
    return record.rows, spent, peak_bytes() - before


def peak_bytes() -> int:
    """Most memory that this process has held (Linux); getrusage would count its parent's too."""
    status = Path("/proc/self/status").read_text()
    return 1024 * int(status.split("VmHWM:")[1].split()[0])


def main(rows: int = 10_000_000) -> None:
    with tempfile.TemporaryDirectory() as folder:
        results = []
        for count in (SHORT, rows):
            path = Path(folder) / f"{count}.csv"
            write(path, count)
            done = subprocess.run(
                [sys.executable, __file__, "--read", str(path)], check=True, capture_output=True, text=True
            )
            read, spent, peak = done.stdout.split()
            assert int(read) == count
            results.append((count, float(spent), int(peak), path.stat().st_size))
    (short, short_s, short_peak, _), (long, long_s, peak, size) = results
    print(f"{long} rows: time per row {long_s / long / (short_s / short):.2f} times that of {short} rows")
    print(f"peak memory {peak / size:.2f} times the text, {peak / (32 * long):.2f} times the record's four columns")
    print(f"that is {(peak - short_peak) / (long - short):.0f} bytes per row beyond those of the short log")


if __name__ == "__main__":
    if sys.argv[1:2] == ["--read"]:
        print(*measure(Path(sys.argv[2])))
    else:
        main(*(int(a) for a in sys.argv[1:]))
