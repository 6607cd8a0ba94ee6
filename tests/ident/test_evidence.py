"""Criteria and residual tests beside published values (CHECKS.md section 5) and statsmodels."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.signal import lfilter
from statsmodels.stats.diagnostic import acorr_ljungbox

from ident.evidence.criteria import aic, aicc, bic, fit_percent, fpe
from ident.evidence.residuals import autocorrelation, left_in, ljung_box

K = np.arange(1, 51)
SERIES = np.sin(K**2) - np.sin(K**2).mean()  # CHECKS.md section 5: s_k = sin(k^2), k = 1..50, mean removed


def test_criteria_have_the_published_values() -> None:
    # CHECKS.md section 5: n = 100, p = 4, RSS = 25.
    assert aic(25.0, 100, 4) == pytest.approx(-130.629436, abs=5e-7)
    assert aicc(25.0, 100, 4) == pytest.approx(-130.208383, abs=5e-7)
    assert bic(25.0, 100, 4) == pytest.approx(-120.208755, abs=5e-7)
    assert fpe(25.0, 100, 4) == pytest.approx(0.27083333, abs=5e-9)
    full = aic(25.0, 100, 5) + 100 * (np.log(2 * np.pi) + 1)
    assert full == pytest.approx(155.158271, abs=5e-7)
    assert aicc(25.0, 5, 4) is None


def test_criteria_differ_from_statsmodels_by_its_constants() -> None:
    # statsmodels OLS counts coefficients only and keeps n (ln 2 pi + 1).
    rng = np.random.default_rng(0)
    X, y = rng.standard_normal((80, 3)), rng.standard_normal(80)
    ols = sm.OLS(y, X).fit()
    constants = 80 * (np.log(2 * np.pi) + 1)
    assert aic(ols.ssr, 80, 3) + constants == pytest.approx(ols.aic)
    assert bic(ols.ssr, 80, 3) + constants == pytest.approx(ols.bic)


def test_autocorrelations_of_the_reference_series() -> None:
    r = autocorrelation(SERIES, 5)
    assert r == pytest.approx([-0.27293275, -0.02990283, 0.01322049, -0.02617766, -0.23676326], abs=5e-9)


@pytest.mark.parametrize(("lags", "q", "p"), [(5, 7.28832758, 0.200065), (10, 10.15382387, 0.42710310)])
def test_ljung_box_of_the_reference_series(lags: int, q: float, p: float) -> None:
    found = ljung_box(autocorrelation(SERIES, lags), 50)
    assert found == pytest.approx((q, p), abs=5e-7)


def test_ljung_box_of_a_coloured_series() -> None:
    # CHECKS.md section 5: AR(1) with 0.8 driven by the reference series (its mean left in), y_0 = s_1.
    y = lfilter([1.0], [1.0, -0.8], np.sin(K**2))
    q, p = ljung_box(autocorrelation(y, 10), 50)
    assert q == pytest.approx(38.385059, abs=5e-7)
    assert p == pytest.approx(3.3e-5, abs=5e-7)


@pytest.mark.parametrize("fitted", [0, 3])
def test_ljung_box_is_statsmodels(fitted: int) -> None:
    e = np.random.default_rng(1).standard_normal(300)
    theirs = acorr_ljungbox(e - e.mean(), lags=[12], model_df=fitted)
    q, p = ljung_box(autocorrelation(e, 12), 300, fitted)
    assert (q, p) == pytest.approx((theirs["lb_stat"].iloc[0], theirs["lb_pvalue"].iloc[0]))


def test_fit_percent_is_one_less_the_share_of_the_norm() -> None:
    y = np.array([0.0, 1.0, 2.0, 3.0])
    assert fit_percent(y, y) == 100.0
    assert fit_percent(y, np.full(4, 1.5)) == pytest.approx(0.0)
    assert fit_percent(y, y + 1.0) == pytest.approx(100.0 * (1.0 - 2.0 / np.sqrt(5.0)))
    assert fit_percent(np.ones(4), y) is None


def test_what_is_left_in_residuals_is_found_at_its_rate() -> None:
    # A score test of a true null is uniform: 400 seeded runs know a share of 0.05 to 0.011 (one sigma).
    rng = np.random.default_rng(2)
    X = np.vstack((np.ones(200), rng.standard_normal((5, 200))))
    p = []
    for _ in range(400):
        y = X[:3].T @ [1.0, 2.0, 3.0] + rng.standard_normal(200)
        e = y - X[:3].T @ np.linalg.lstsq(X[:3].T, y, rcond=None)[0]
        p.append(left_in(np.vstack((e, X)), 3))
    assert np.mean(np.array(p) < 0.05) == pytest.approx(0.05, abs=0.035)
    assert left_in(np.vstack((e + 0.5 * X[4], X)), 3) < 1e-4
