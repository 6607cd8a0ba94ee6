"""20,000 damaged logs: none may crash the reader, take long, or be refused without a code.

Run: python tests/benchmarks/fuzz_read_csv.py [count] [seed]. Prints how they ended; the slowest one beside a clean log.
"""

from __future__ import annotations

import sys
import time
import warnings
from collections import Counter
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "ident"))

from mutate import mutated, seeds

from ident import IdentError, read_csv

LONGEST = 700  # characters of a message
SLOW = 50.0  # times a clean log of the same kind


def ending(text: bytes) -> str:
    """The code a log is refused with, or "read"; what it says must be printable and short."""
    try:
        record = read_csv(text)
    except IdentError as error:
        return _sound(error.code, error.message)
    assert record.source is not None
    for finding in record.source.findings:
        _sound(finding.code, finding.message)
    assert np.all(np.diff(record.time) > 0)
    return "read"


def _sound(code: str, message: str) -> str:
    assert code, "an error without a code"
    assert message.isprintable(), message
    assert len(message) < LONGEST, message
    return code


def main(count: int = 20_000, seed: int = 6) -> int:
    warnings.simplefilter("error")
    logs = seeds()
    begin = time.process_time()
    for text in logs * 5:
        assert ending(text) == "read", (ending(text), text[:100])
    clean = (time.process_time() - begin) / (5 * len(logs))
    ends: Counter[str] = Counter()
    slowest, faults = 0.0, 0
    for k in range(count):
        text = mutated(logs, np.random.default_rng([seed, k]))
        begin = time.process_time()
        try:
            ends[ending(text)] += 1
        except Exception as fault:
            faults += 1
            print(f"file {k}: {type(fault).__name__}: {fault}")
        slowest = max(slowest, (time.process_time() - begin) / clean)
    print(f"{count} damaged logs: {faults} faults, slowest {slowest:.1f} times a clean one")
    print(", ".join(f"{code} {n}" for code, n in ends.most_common()))
    return int(faults > 0 or slowest > SLOW)


if __name__ == "__main__":
    sys.exit(main(*(int(a) for a in sys.argv[1:])))
