"""500 random plants against brute force: the committed table, and a sample of it tuned again.

tests/reference/brute_force_tune.csv was made once by tests/benchmarks/brute_force_tune.py, whose search knows nothing
of ident's. A ratio below 1 is what `tune` missed, above 1 what brute force missed.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

import ident
from tests.benchmarks.brute_force_tune import Lags

TABLE = Path(__file__).parents[1] / "reference" / "brute_force_tune.csv"
ROWS = list(csv.DictReader(TABLE.read_text().splitlines()))


def test_the_table_as_a_whole() -> None:
    ratio = np.array([float(row["ratio"]) for row in ROWS])
    assert len(ratio) == 500
    # Worst: 0.43 % of ki missed (a PID); all but three within 0.2 %.
    assert ratio.min() > 0.9955
    assert np.sum(ratio < 0.998) <= 3
    assert all(float(row["worst"]) <= float(row["M"]) * (1 + 1e-5) for row in ROWS)


@pytest.mark.parametrize("row", ROWS[::25], ids=lambda row: row["seed"])
def test_a_sample_is_tuned_as_the_table_says(row: dict[str, str]) -> None:
    plant = Lags(float(row["K"]), tuple(float(T) for T in row["T"].split()), float(row["L"]))
    found = ident.tune(plant, Ms=float(row["M"]), form=row["form"])
    assert found.settings.ki == pytest.approx(float(row["ki"]), rel=1e-4)
    worst = max(found.margins.Ms or np.inf, found.margins.Mt or np.inf)
    assert worst == pytest.approx(float(row["M"]), abs=0.005)
