"""The step that odd logs are written of: 30 rows, 0.1 s apart, 900 to 1200 rpm at row 8; and what is asked of a record.

It is the step of ../shared/odd_logs; `test_read_odd.py` checks that.
"""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np

from ident import Finding, LoopRecord

START = datetime(2026, 3, 2, 8, 15, tzinfo=UTC)
SP = [900.0] * 8 + [1200.0] * 22
CO = [
    *[30.0] * 8, 38.0, 37.48, 37.49, 37.69, 37.94, 38.2, 38.44, 38.65, 38.83, 38.99, 39.13, 39.25, 39.36, 39.44, 39.52,
    39.59, 39.64, 39.69, 39.74, 39.77, 39.8, 39.83,
]  # fmt: skip
PV = [
    900.0, 900.4, 899.6, 898.7, 899.3, 898.5, 900.1, 902.0, 899.3, 993.5, 1046.3, 1077.2, 1098.1, 1112.4, 1126.4,
    1138.0, 1143.8, 1152.7, 1156.9, 1163.4, 1167.4, 1174.0, 1175.9, 1181.3, 1183.8, 1185.5, 1183.9, 1188.7, 1190.8,
    1192.3,
]  # fmt: skip


def iso(k: int, step: float = 0.1) -> str:
    return f"{START + timedelta(seconds=k * step):%Y-%m-%dT%H:%M:%S.%f}"[:-3] + "Z"


def rows() -> list[list[str]]:
    return [[iso(k), str(SP[k]), str(CO[k]), str(PV[k])] for k in range(30)]


def text(table: list[list[str]], head: str = "Time,SP,CO,PV") -> bytes:
    return "\n".join([head, *(",".join(row) for row in table), ""]).encode()


def codes(record: LoopRecord) -> list[str]:
    assert record.source is not None
    return [f.code for f in record.source.findings]


def finding(record: LoopRecord, code: str) -> Finding:
    assert record.source is not None
    (found,) = (f for f in record.source.findings if f.code == code)
    return found


def is_the_step(record: LoopRecord, left_out: tuple[int, ...] = ()) -> None:
    kept = [k for k in range(30) if k not in left_out]
    np.testing.assert_allclose(record.time, np.array(kept) / 10, rtol=0, atol=1e-12)
    assert record.setpoint is not None
    assert record.setpoint.tolist() == [SP[k] for k in kept]
    assert record.command.tolist() == [CO[k] for k in kept]
    assert record.speed.tolist() == [PV[k] for k in kept]


def odd(shared: Path, number: str) -> Path:
    return next((shared / "odd_logs").glob(f"{number}_*.csv"))
