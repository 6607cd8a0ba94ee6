"""Plants that a log allows, and the margins over them."""

from __future__ import annotations

import numpy as np
import pytest

import ident
from ident.estimate import plausible
from ident.tune import worst_case
from tests.reference.held_fopdt import respond


def noisy_fit(sigma: float, seed: int = 0) -> ident.Fit:
    u = np.where(np.arange(600) % 300 < 50, 0.0, 1.0)
    y = respond(u, 0.01, -2.0, 0.5, 0.105) + sigma * np.random.default_rng(seed).standard_normal(600)
    return ident.fit(ident.LoopRecord(0.01 * np.arange(600), u, y), "fopdt")


def test_drawn_plants_spread_as_the_fit_says() -> None:
    fit = noisy_fit(0.1)
    plants = plausible(fit, np.random.default_rng(1), 4000)
    for name in ("K", "T", "L"):
        values = np.array([getattr(plant, name) for plant in plants])
        estimate = fit.parameters[name]
        assert estimate.std is not None
        # 4,000 draws know a spread to about 1 %; the dead time's profile is not quite normal.
        assert values.std() == pytest.approx(estimate.std, rel=0.12)
        low, high = estimate.ci95
        assert low is not None
        assert high is not None
        assert np.mean((values >= low) & (values <= high)) == pytest.approx(0.95, abs=0.02)


def test_no_plant_changes_sign_or_runs_ahead_of_its_command() -> None:
    plants = plausible(noisy_fit(1.0), np.random.default_rng(1), 2000)
    assert all(plant.K < 0 and plant.T > 0 and plant.L >= 0 for plant in plants)


def test_the_same_seed_draws_the_same_plants() -> None:
    fit = noisy_fit(0.1)
    assert plausible(fit, np.random.default_rng(3), 5) == plausible(fit, np.random.default_rng(3), 5)


def test_quantiles_equal_those_of_each_loops_own_margins() -> None:
    fit = noisy_fit(0.3)
    settings = ident.tune(fit.model, Ms=1.6, period=0.01).settings
    plants = plausible(fit, np.random.default_rng(2), 60)
    found = worst_case(plants, settings, delay=fit.model.dead_time, period=0.01)
    each = [ident.margins(plant, settings, period=0.01) for plant in plants]
    Ms = np.array([np.inf if m.Ms is None else m.Ms for m in each])
    assert found is not None
    assert found.unstable_share == np.mean([not m.stable for m in each])
    assert found.Ms_median == pytest.approx(float(np.quantile(Ms, 0.5, method="higher")), rel=2e-3)
    assert found.Ms_p95 == pytest.approx(float(np.quantile(Ms, 0.95, method="higher")), rel=2e-3)


def test_unstable_plants_are_counted_and_leave_no_percentile() -> None:
    plants = [ident.Fopdt(1.0, 1.0, 0.2), ident.Fopdt(1.0, 1.0, 1.0)]
    found = worst_case(plants, ident.PidSettings(4.0, 1.0), delay=0.2)
    assert found is not None
    assert found.unstable_share == 0.5
    assert found.Ms_p95 is None
