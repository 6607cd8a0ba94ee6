"""Sustained oscillation: the published test on signals whose answer is known, then on a measured loop."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import ident
from ident.judge.oscillation import swing


@pytest.mark.parametrize(("noise", "at_least"), [(0.2, 50.0), (0.5, 15.0), (1.0, 5.0)])
def test_a_noisy_sine_is_regular(noise: float, at_least: float) -> None:
    # Thornhill, Huang and Zhang 2003, as recomputed in CHECKS.md section 6: N 2000, period 40, unit sine; period 39.87
    # to 40.00 there, regularity far above 1.
    t = np.arange(2000)
    found = swing(np.sin(2 * np.pi * t / 40) + noise * np.random.default_rng(0).standard_normal(2000))
    assert found is not None
    assert found.period == pytest.approx(40.0, abs=0.5)
    assert found.regularity > at_least


def test_white_noise_is_not() -> None:
    # The same source: 200 seeds, the largest 0.981.
    found = [swing(np.random.default_rng(seed).standard_normal(2000)) for seed in range(200)]
    assert max(one.regularity for one in found if one is not None) < 1.05


def test_a_wheel_that_swings_by_itself(shared: Path) -> None:
    # github opatiny/micromouse: sustained oscillation with a speed refreshed every 110 ms (datasets' README).
    report = ident.analyse(ident.read_csv(shared / "datasets" / "mouse_pid1_limitcycle.csv"), subspace=False)
    found = next(f for f in report.findings if f.code == "sustained-oscillation")
    assert 0.2 < float(found.evidence["period_s"] or 0.0) < 2.0
