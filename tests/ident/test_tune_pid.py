"""The largest-ki PID: the reference table, cost, random search around the answer, refusals."""

from __future__ import annotations

import csv
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from tuning_plants import Counting, reference_plant

from ident.errors import Refused
from ident.loop import PidSettings, margins
from ident.plants import Fopdt
from ident.tune import tune


def _rows(shared: Path) -> list[dict[str, str]]:
    with (shared / "checks" / "optimum.csv").open() as file:
        return [r for r in csv.DictReader(file) if r["filter"] == "meas2_Tf=Td/10" and r["objective"] == "max_ki"]


def test_reference_table_and_cost(shared: Path) -> None:
    # optimum.csv (differential evolution and SLSQP, CHECKS.md section 4b): bar 0.2 % in ki, and at most 2,000
    # evaluations of a 400-point response.
    rows = _rows(shared)
    assert len(rows) == 25
    for row in rows:
        plant = Counting(reference_plant(row["plant"]))
        target = float(row["Ms_limit"])
        found = tune(plant, Ms=target, form="pid")
        assert plant.points / 400 < 2000
        assert found.settings.ki == pytest.approx(float(row["ki"]), rel=1e-5), row
        assert found.settings.Td == pytest.approx(float(row["Td"]), rel=5e-3), row
        assert found.settings.Tf == pytest.approx(found.settings.Td / 10)
        assert found.margins.Ms is not None
        assert found.margins.Mt is not None
        assert abs(max(found.margins.Ms, found.margins.Mt) - target) < 1e-6, row


@pytest.mark.parametrize(
    ("plant", "timing"),
    [
        (Fopdt(-245.0, 0.12, 0.004), {"period": 0.01}),
        (Fopdt(2.0, 3.0, 0.0), {"period": 0.2, "compute_delay": 0.1}),
        (Fopdt(1.0, 0.3, 2.0), {}),
    ],
)
def test_no_random_neighbour_is_better(plant: Fopdt, timing: dict[str, float]) -> None:
    found = tune(plant, Ms=1.5, form="pid", **timing)
    best, rng = found.settings, np.random.default_rng(8)
    delay = plant.L + timing.get("period", 0.0) / 2 + timing.get("compute_delay", 0.0)
    w = np.geomspace(1e-3 / delay, 1e3 / delay, 4000)
    response = Fopdt(plant.K, plant.T, delay).frequency_response(w)
    feasible = 0
    for _ in range(3000):
        Kp, ki, Td = (np.array([best.Kp, best.ki, best.Td])) * np.exp(rng.normal(0, [0.1, 0.05, 0.2]))
        s = PidSettings(Kp, abs(Kp) / ki, Td, Td / 10)
        loop = response * s.frequency_response(w)
        if max(np.max(1 / np.abs(1 + loop)), np.max(np.abs(loop / (1 + loop)))) > 1.5:
            continue
        feasible += 1
        assert s.ki <= best.ki * (1 + 1e-4) or not margins(plant, s, **timing).stable
    assert feasible > 20
    assert found.predicted is not None


def test_scales_and_signs() -> None:
    one, other = tune(Fopdt(1, 1, 0.3), form="pid").settings, tune(Fopdt(-20, 1e-3, 3e-4), form="pid").settings
    assert other.Kp == pytest.approx(-one.Kp / 20, rel=1e-3)
    assert other.ki == pytest.approx(one.ki / 20 * 1e3, rel=1e-5)
    assert other.Td == pytest.approx(one.Td * 1e-3, rel=1e-3)


def test_unbounded_without_delay() -> None:
    class TwoLags:
        def frequency_response(self, w: Any) -> Any:
            return 1 / ((1 + 1j * np.asarray(w)) * (1 + 0.1j * np.asarray(w)))

    assert tune(TwoLags()).margins.stable  # a PI is bounded by the second lag
    for plant in (TwoLags(), Fopdt(1, 1, 0)):
        with pytest.raises(Refused, match="unbounded"):
            tune(plant, form="pid")


def test_an_integrating_plant_bounds_no_derivative() -> None:
    class Integrating:
        def frequency_response(self, w: Any) -> Any:
            return np.exp(-1j * np.asarray(w)) / (1j * np.asarray(w))

    assert tune(Integrating(), Ms=1.7).margins.stable
    with pytest.raises(Refused, match="not-offered"):
        tune(Integrating(), form="pid")
