"""Speeding up and slowing down judged apart."""

from __future__ import annotations

import numpy as np
import pytest

import ident

H, ROWS = 0.01, 3000


def record(T_up: float, T_down: float, K: float, seed: int) -> ident.LoopRecord:
    """A lag whose time constant depends on the direction of the speed, by its own exact step from row to row."""
    u = np.where(np.arange(ROWS) // 300 % 2 == 0, 0.0, 1.0)
    speed, y = 0.0, np.empty(ROWS)
    for k in range(ROWS):
        y[k] = speed
        target = K * u[max(k - 5, 0)]
        speed += (target - speed) * -np.expm1(-H / (T_up if target > speed else T_down))
    return ident.LoopRecord(H * np.arange(ROWS), u, y + 0.05 * np.random.default_rng(seed).standard_normal(ROWS))


@pytest.mark.parametrize("K", [2.0, -2.0])
def test_two_time_constants_are_named(K: float) -> None:
    found = {f.code: f for f in ident.fit(record(0.3, 0.6, K, 0), "fopdt").findings}
    evidence = found["up-and-down-differ"].evidence
    assert evidence["T_up_s"] == pytest.approx(0.3, rel=0.1)
    assert evidence["T_down_s"] == pytest.approx(0.6, rel=0.1)


def test_one_time_constant_is_left_alone() -> None:
    codes = [f.code for seed in range(20) for f in ident.fit(record(0.4, 0.4, 2.0, seed), "fopdt").findings]
    assert "up-and-down-differ" not in codes
