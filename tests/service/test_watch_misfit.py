"""A stored night says, as the fit did, whether its first-order model left dynamics out."""

from __future__ import annotations

import numpy as np
import pytest

import ident
from service.work.numbers import numbers_of, parse, read_numbers, write_numbers
from service.work.report import to_json
from service.work.watch import night_of

H, ROWS = 0.05, 1500


def record(second_lag: float) -> ident.LoopRecord:
    u = np.where(np.arange(ROWS) // 150 % 2 == 0, 30.0, 35.0)
    speed = inner = 450.0
    y = np.empty(ROWS)
    for k in range(ROWS):
        y[k] = speed
        inner += (15.0 * u[k] - inner) * -np.expm1(-H)
        speed += (inner - speed) * -np.expm1(-H / second_lag) if second_lag else inner - speed
    noise = np.random.default_rng(1).standard_normal(ROWS)
    return ident.LoopRecord(H * np.arange(ROWS), u, y + noise, speed_unit="rpm", command_unit="%")


@pytest.mark.parametrize(("second_lag", "misfit"), [(0.0, False), (0.8, True)])
def test_misfit_survives_the_store(second_lag: float, misfit: bool) -> None:
    log = record(second_lag)
    report = ident.analyse(log, period=H, subspace=False)
    kept = read_numbers(write_numbers(numbers_of(parse(to_json(report)))))
    night, why = night_of(kept, None)
    assert why is None
    assert night is not None
    assert night.misfit is misfit
    assert night.misfit == ident.Night.of(ident.fit(log, "fopdt")).misfit
