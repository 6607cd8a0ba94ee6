"""The margin that is left: Ms of many plants at once, and its interval."""

from __future__ import annotations

import numpy as np
import pytest

import ident
from ident.watch.interval import sensitivities

PI = ident.PidSettings(0.075, 2.3)


def at(*plants: tuple[float, float, float]) -> np.ndarray:
    return np.array([(K / T, 1.0 / T, L) for K, T, L in plants])


@pytest.mark.parametrize("T", [1.0, 4.0, 8.0])
def test_known_sensitivity_of_a_published_rule(T: float) -> None:
    # Skogestad 2003, J. Process Control 13, table 1: PI with tau_c = L on a FOPDT with T <= 8 L has Ms = 1.59.
    settings = ident.PidSettings(T / 2.0, T)
    assert sensitivities(at((1.0, T, 1.0)), settings, 0.0) == pytest.approx([1.59], abs=5e-3)


def test_published_sensitivity_of_an_integrating_plant() -> None:
    # The same table: integrating plant k' exp(-L s)/s, Kp = 1/(2 k' L), Ti = 8 L has Ms = 1.70.
    assert sensitivities(np.array([[2.0, 0.0, 1.0]]), ident.PidSettings(0.25, 8.0), 0.0) == pytest.approx(
        [1.70], abs=5e-3
    )


def test_many_at_once_agree_with_one_at_a_time() -> None:
    rng = np.random.default_rng(4)
    plants = [
        (float(K), float(T), float(L)) for K, T, L in np.exp(rng.normal((2.7, 0.6, -1.0), (0.9, 0.7, 0.6), (300, 3)))
    ]
    settings = ident.PidSettings(0.15, 1.5, 0.2, 0.05)
    found = sensitivities(at(*plants), settings, 0.05)
    one = [ident.margins(ident.Fopdt(*p), settings, period=0.1) for p in plants]
    stable = np.array([m.stable for m in one])
    assert 30 < stable.sum() < 290
    assert (np.isfinite(found) == stable).all()
    Ms = np.array([m.Ms for m in one if m.Ms is not None])
    moderate = Ms < 10.0  # a peak that high is narrower than the grid
    assert found[stable][moderate] == pytest.approx(Ms[moderate], rel=3e-3)


def test_wrong_sign_is_unstable() -> None:
    assert np.isinf(sensitivities(at((-14.6, 1.83, 0.37)), PI, 0.05)).all()


def night(K: float, share: float) -> ident.Night:
    variances = np.diag(np.square([share * K, share * 1.83, share]))
    return ident.Night(K, 1.83, 0.37, tuple(map(tuple, variances.tolist())))


def test_the_interval_covers_and_is_the_same_again() -> None:
    found = ident.drift([night(14.6, 0.01)], night(20.0, 0.02), settings=PI, period=0.1).margin
    assert found is not None
    assert (found.settings, found.settings_from, found.target) == (PI, "installed", 1.6)
    assert found.Ms_baseline == pytest.approx(
        ident.margins(ident.Fopdt(14.6, 1.83, 0.37), PI, period=0.1).Ms, rel=1e-12
    )
    low, high = found.ci95
    assert low is not None
    assert high is not None
    assert found.Ms_now is not None
    assert low < found.Ms_now < high
    assert found.unstable_share == 0.0
    assert found == ident.drift([night(14.6, 0.01)], night(20.0, 0.02), settings=PI, period=0.1).margin
    # Twice the width of the estimates, twice that of the interval, to first order.
    wide = ident.drift([night(14.6, 0.01)], night(20.0, 0.04), settings=PI, period=0.1).margin
    assert wide is not None
    assert wide.ci95[0] is not None
    assert wide.ci95[1] is not None
    assert (wide.ci95[1] - wide.ci95[0]) / (high - low) == pytest.approx(2.0, rel=0.25)


def test_unstable_plants_leave_the_interval_open() -> None:
    sharp = ident.PidSettings(0.40, 1.5)
    found = ident.drift([night(14.6, 0.01)], night(14.6, 0.12), settings=sharp, period=0.1).margin
    assert found is not None
    assert found.Ms_now is not None
    assert found.unstable_share is not None
    assert 0.025 < found.unstable_share < 0.9
    assert found.ci95[0] is not None
    assert found.ci95[1] is None
    gone = ident.drift([night(14.6, 0.01)], night(60.0, 0.01), settings=sharp, period=0.1).margin
    assert gone is not None
    assert (gone.Ms_now, gone.ci95, gone.unstable_share) == (None, (None, None), 1.0)


def test_without_installed_settings_the_baseline_proposes() -> None:
    found = ident.drift([night(14.6, 0.01)], night(14.6, 0.01), period=0.1, target=1.5).margin
    assert found is not None
    assert found.settings_from == "baseline"
    assert found.Ms_baseline == pytest.approx(1.5, rel=1e-3)


def test_where_nothing_can_be_proposed_it_says_so() -> None:
    no_delay = ident.Night(2.0, 1.0, 0.0, ((1e-4, 0.0, 0.0), (0.0, 1e-4, 0.0), (0.0, 0.0, 0.0)))
    found = ident.drift([no_delay], no_delay)
    assert found.margin is None
    assert found.verdict == "not-moved"
    assert "margin-unknown" in {f.code for f in found.findings}


@pytest.mark.parametrize("L", [0.1, 0.25, 1.0, 3.0])
def test_what_a_move_of_the_practical_size_costs_is_as_stated(L: float) -> None:
    # ident/watch/sizes.py states these figures as the reason for its sizes.
    settings = ident.tune(ident.Fopdt(1.0, 1.0, L), Ms=1.6).settings
    moved = at((1.1, 1.0, L), (1.0, 0.85, L), (1.0, 1.15, L), (1.0, 1.0, 1.2 * L))
    K_up, T_down, T_up, L_up = sensitivities(moved, settings, 0.0)
    assert 1.655 < K_up < 1.695
    assert max(T_down, T_up) < 1.685
    assert L_up == pytest.approx(1.8, abs=0.03)


def test_the_interval_of_a_plant_with_one_uncertain_gain_runs_between_its_ends() -> None:
    # Ms rises with K here, so the quantiles are those of K; 400 draws leave them open by a tenth of the half-width.
    std, settings = 0.05 * 14.6, ident.PidSettings(0.12, 1.2)
    one = ident.Night(14.6, 1.83, 0.37, ((std**2, 0.0, 0.0), (0.0, 1e-12, 0.0), (0.0, 0.0, 1e-12)))
    found = ident.margin_interval(one, settings, period=0.1)
    low, middle, high = (
        ident.margins(ident.Fopdt(14.6 + k * std, 1.83, 0.37), settings, period=0.1).Ms or np.inf
        for k in (-1.96, 0.0, 1.96)
    )
    assert low < middle < high
    assert found.ci95 == pytest.approx((low, high), abs=0.15 * (high - low))
    assert found.Ms_median == pytest.approx(middle, abs=0.05 * (high - low))
    assert found.unstable_share == 0.0


def test_the_interval_of_an_unstable_loop_says_so() -> None:
    found = ident.margin_interval(night(60.0, 0.01), ident.PidSettings(0.40, 1.5), period=0.1)
    assert (found.Ms_median, found.ci95, found.unstable_share) == (None, (None, None), 1.0)
