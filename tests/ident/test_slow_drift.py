"""A speed that drifts along a straight line: fitted beside the model where the data ask for it, and only there."""

from __future__ import annotations

import numpy as np
import pytest

import ident
from tests.reference.held_fopdt import respond

H, K, T, L = 0.05, 2.0, 1.0, 0.3
CLOCK = H * np.arange(2000)
STEPS = np.floor(CLOCK / 15.0) % 3
ONE = np.where(CLOCK > 5.0, 1.0, 0.0)


def drifted(u: np.ndarray, over_log: float, noise: float = 0.0, seed: int = 0) -> ident.LoopRecord:
    line = over_log * CLOCK / CLOCK[-1]
    rng = np.random.default_rng(seed)
    return ident.LoopRecord(CLOCK, u, respond(u, H, K, T, L, 3.0) + line + noise * rng.standard_normal(len(CLOCK)))


@pytest.mark.parametrize("u", [ONE, STEPS], ids=["one step", "steps"])
def test_without_noise_the_plant_comes_back_beside_the_line(u: np.ndarray) -> None:
    fit = ident.fit(drifted(u, 0.4), "fopdt")
    assert [fit.model.K, fit.model.T, fit.model.L] == pytest.approx([K, T, L], rel=1e-6)
    found = next(f for f in fit.findings if f.code == "slow-drift")
    assert found.evidence["over_log"] == pytest.approx(0.4, rel=1e-3)
    # The second lag is not there, so its minimum is a valley; the gain must not lean on where in it the descent ends.
    richer = ident.fit(drifted(u, 0.4), "sopdt").model
    assert richer.static_gain == pytest.approx(K, rel=1e-3)


@pytest.mark.parametrize("over_log", [0.0, 0.3])
def test_intervals_cover_with_and_without_a_line(over_log: float) -> None:
    # 40 logs, three intervals each at 95 %: below 104 of 120 is a chance of about 1 in 1,000.
    covered, kept = 0, 0
    for seed in range(40):
        fit = ident.fit(drifted(STEPS, over_log, 0.1, seed), "fopdt")
        kept += any(f.code == "slow-drift" for f in fit.findings)
        for name, true in (("K", K), ("T", T), ("L", L)):
            low, high = fit.parameters[name].ci95
            covered += low is not None and high is not None and low <= true <= high
    assert covered >= 104
    assert kept == (40 if over_log else 0)


def test_a_line_left_in_would_move_the_gain_beyond_its_interval() -> None:
    # Least squares without the line (numpy), T and L known: what the finding is there to prevent.
    record = drifted(ONE, 0.3, 0.1)
    unit = respond(ONE, H, 1.0, T, L)
    plain = np.linalg.lstsq(np.column_stack((unit, np.ones_like(unit))), record.speed, rcond=None)[0][0]
    estimate = ident.fit(record, "fopdt").parameters["K"]
    low, high = estimate.ci95
    assert low is not None
    assert high is not None
    assert low <= K <= high < plain
