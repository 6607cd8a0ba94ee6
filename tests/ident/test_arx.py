"""ARX: its fit beside two libraries and a recipe, the search for orders, what it refuses."""

from __future__ import annotations

import warnings
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy.signal import lfilter

import ident
from ident.estimate.arx import fit_arx
from ident.estimate.lagged import even_runs
from ident.estimate.orders import search_orders
from ident.plants.arx import Arx
from tests.reference.held_fopdt import coefficients, respond

H = 0.05
PLANT = Arx([-1.7, 0.72], [0.02, 0.03], 5, H)


def random_binary(n: int, hold: int = 20, seed: int = 0) -> np.ndarray:
    return np.repeat(np.random.default_rng(seed).choice([-1.0, 1.0], n // hold + 1), hold)[:n]


def with_arx_noise(model: Arx, u: np.ndarray, sigma: float, rng: np.random.Generator) -> np.ndarray:
    return model.simulate(u) + lfilter([1.0], [1.0, *model.a], sigma * rng.standard_normal(len(u)))


def record_of(u: np.ndarray, y: np.ndarray, h: float = H) -> ident.LoopRecord:
    return ident.LoopRecord(h * np.arange(len(u)), u, y)


# The fit at given orders


def stacked(segments: list[tuple[np.ndarray, np.ndarray]], na: int, nb: int, delay: int) -> tuple[np.ndarray, ...]:
    """Rows with full history of every segment, written out one by one."""
    X, y_out = [], []
    for u, y in segments:
        for k in range(max(na, delay + nb - 1), len(y)):
            X.append([*(-y[k - i] for i in range(1, na + 1)), *(u[k - delay - j] for j in range(nb))])
            y_out.append(y[k])
    return np.array(X), np.array(y_out)


@pytest.mark.parametrize("orders", [(1, 1, 1), (2, 2, 5), (3, 4, 2), (0, 6, 4), (5, 1, 7)])
def test_coefficients_and_their_stds_are_statsmodels(orders: tuple[int, int, int]) -> None:
    rng = np.random.default_rng(1)
    u = random_binary(3000)
    y = with_arx_noise(PLANT, u, 0.02, rng)
    u, y = u - u.mean(), y - y.mean()
    fit = fit_arx(record_of(u, y), orders)
    ols = sm.OLS(*reversed(stacked([(u, y)], *orders))).fit()
    assert [p.value for p in fit.parameters.values()] == pytest.approx(ols.params, abs=1e-8, rel=1e-8)
    assert [p.std for p in fit.parameters.values()] == pytest.approx(ols.bse, rel=1e-6)
    assert (*fit.model.a, *fit.model.b) == tuple(p.value for p in fit.parameters.values())
    assert fit.statistics.rows_used == ols.nobs


def test_a_constant_stays_where_the_means_are_off_the_plants_line() -> None:
    # One step from rest: the means of the record are no working point of the plant.
    rng = np.random.default_rng(2)
    u = np.where(np.arange(600) < 150, 0.0, 1.0)
    y = with_arx_noise(PLANT, u, 0.002, rng) + 40.0
    fit = fit_arx(record_of(u, y), (2, 2, 5))
    X, target = stacked([(u, y)], 2, 2, 5)
    ols = sm.OLS(target, sm.add_constant(X, prepend=False)).fit()
    assert [p.value for p in fit.parameters.values()] == pytest.approx(ols.params[:-1], abs=1e-8)
    assert [p.std for p in fit.parameters.values()] == pytest.approx(ols.bse[:-1], rel=1e-6)


def test_every_segment_starts_afresh() -> None:
    rng = np.random.default_rng(3)
    u = random_binary(2000)
    y = with_arx_noise(PLANT, u, 0.02, rng)
    keep = np.ones(2000, bool)
    keep[600:640] = keep[1500:1503] = False
    t = H * np.arange(2000)
    u, y = u - u[keep].mean(), y - y[keep].mean()
    fit = fit_arx(ident.LoopRecord(t[keep], u[keep], y[keep]), (2, 2, 5))
    parts = [(u[a:b], y[a:b]) for a, b in ((0, 600), (640, 1500), (1503, 2000))]
    ols = sm.OLS(*reversed(stacked(parts, 2, 2, 5))).fit()
    assert [p.value for p in fit.parameters.values()] == pytest.approx(ols.params, abs=1e-8)
    # The first six rows of each segment have no full history.
    assert np.flatnonzero(np.isnan(fit.simulated)).tolist() == [
        *range(6), *range(600, 606), *range(1460, 1466)
    ]  # fmt: skip


@pytest.mark.parametrize("orders", [(1, 1, 1), (2, 2, 5), (3, 2, 4)])
def test_coefficients_are_sippys(orders: tuple[int, int, int]) -> None:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        sippy = pytest.importorskip("sippy_unipi")
        u = random_binary(1500, seed=4)
        y = with_arx_noise(PLANT, u, 0.02, np.random.default_rng(4))
        na, nb, delay = orders
        # Its delay 0 is lag 1.
        theirs = sippy.system_identification(
            y.copy(), u.copy(), "ARX", centering="MeanVal", ARX_orders=[na, nb, delay - 1], tsample=H
        )
    fit = fit_arx(record_of(u, y), orders)
    assert list(fit.model.a) == pytest.approx(np.ravel(theirs.DENOMINATOR)[1 : na + 1], abs=1e-8)
    assert list(fit.model.b) == pytest.approx(np.ravel(theirs.NUMERATOR)[delay - 1 : delay - 1 + nb], abs=1e-8)


def test_the_dryer_by_the_textbooks_recipe(shared: Path) -> None:
    # Ljung, System Identification, 1999: ARX na 2, nb 2, delay 3, first 300 samples, means removed; the figures as
    # computed in the datasets' README.
    table = pd.read_csv(shared / "datasets" / "dryer_pt326.csv")[:300]
    fit = fit_arx(ident.LoopRecord(table["t_s"], table["command"], table["output"]), (2, 2, 3))
    assert [round(v, 4) for v in fit.model.a] == [-1.2737, 0.3935]
    assert [round(v, 5) for v in fit.model.b] == [0.06662, 0.04448]
    assert fit.model.dead_time == pytest.approx(0.16)


# The search


def closed_loop(plant: Arx, r: np.ndarray, Kp: float = 1.0, Ti: float = 1.0) -> tuple[np.ndarray, np.ndarray]:
    """A PI around the plant, row by row."""
    n = len(r)
    u, y, integral = np.zeros(n), np.zeros(n), 0.0
    for k in range(n):
        y[k] = -sum(a * y[k - i] for i, a in enumerate(plant.a, 1) if k >= i) + sum(
            b * u[k - plant.delay - j] for j, b in enumerate(plant.b) if k >= plant.delay + j
        )
        e = r[k] - y[k]
        integral += Kp * H / Ti * e
        u[k] = Kp * e + integral
    return u, y


@pytest.mark.parametrize("offset", [0.0, 900.0])
@pytest.mark.parametrize("kind", ["step", "random binary", "closed loop"])
@pytest.mark.parametrize(
    "plant",
    [
        Arx([-0.95], [0.1], 1, H),
        Arx([-0.99], [-0.004, -0.008], 12, H),
        PLANT,
        Arx([-1.5, 0.7], [0.3], 21, H),
        Arx([-1.2, 0.3, 0.05], [0.1, 0.05], 2, H),
    ],
    ids=["first order", "slow, split", "second order", "oscillating, late", "third order"],
)
def test_without_noise_the_equation_comes_back(plant: Arx, kind: str, offset: float) -> None:
    if kind == "closed loop":
        u, y = closed_loop(plant, random_binary(1500, 150, seed=5), Kp=0.3 / abs(plant.static_gain), Ti=3.0)
        if plant.static_gain < 0:
            u, y = closed_loop(plant, random_binary(1500, 150, seed=5), Kp=-0.3 / abs(plant.static_gain), Ti=3.0)
    else:
        u = np.where(np.arange(1500) % 700 < 100, 0.0, 1.0) if kind == "step" else random_binary(1500)
        y = plant.simulate(u)
    fit = fit_arx(record_of(u + 30.0, y + offset))
    assert (len(fit.model.a), len(fit.model.b), fit.model.delay) == (len(plant.a), len(plant.b), plant.delay)
    assert list(fit.model.a) == pytest.approx(list(plant.a), rel=1e-6)
    assert list(fit.model.b) == pytest.approx(list(plant.b), rel=1e-6)
    assert fit.statistics.fit_percent == pytest.approx(100.0, abs=1e-5)
    assert fit.statistics.aicc is None  # no residuals, no likelihood


def test_a_sampled_first_order_plant_has_its_published_coefficients() -> None:
    # CHECKS.md section 8: K 2, T 0.5, L 0.105, h 0.01 (delay 11: ten whole samples and the one of the hold).
    u = random_binary(2000, 25)
    fit = fit_arx(record_of(u, respond(u, 0.01, 2.0, 0.5, 0.105), 0.01))
    d, a, b1, b2 = coefficients(2.0, 0.5, 0.105, 0.01)
    assert fit.model.delay == d + 1
    assert [*fit.model.a, *fit.model.b] == pytest.approx([-a, b1, b2], rel=1e-9)
    assert fit.derived["K"].value == pytest.approx(2.0, rel=1e-9)
    assert fit.derived["T_r"].value == pytest.approx(0.605, rel=1e-4)  # T + L


def test_one_gram_matrix_gives_every_candidates_sum_of_squares() -> None:
    u = random_binary(800, 7, seed=6)
    y = with_arx_noise(PLANT, u, 0.05, np.random.default_rng(6))
    found = search_orders(even_runs(record_of(u, y)))
    bic = {}
    for na in range(1, 5):
        for nb in range(1, 5):
            for delay in range(1, 22):
                X, target = stacked([(u, y)], na, nb, delay)
                X, target = X[-776:], target[-776:]  # the rows that all candidates have
                X = sm.add_constant(X)
                e = target - X @ np.linalg.lstsq(X, target, rcond=None)[0]
                bic[na, nb, delay] = 776 * np.log(e @ e / 776) + (na + nb) * np.log(776)
                if (na, nb) == (found.na, found.nb):
                    assert found.over_delay[delay - 1] == pytest.approx(e @ e, rel=1e-8)
    assert found.rows == 776
    assert (found.na, found.nb, found.delay) == min(bic, key=bic.__getitem__)


def test_noise_of_the_models_own_kind_is_covered_by_the_intervals() -> None:
    # Bar: 95 % intervals cover; 150 runs know a share of 0.95 to 0.018 (one sigma).
    rng = np.random.default_rng(7)
    u = random_binary(1500, seed=8)
    true = {"a1": -1.7, "a2": 0.72, "b1": 0.02, "b2": 0.03, "K": 2.5}
    inside = []
    for _ in range(150):
        fit = fit_arx(record_of(u, with_arx_noise(PLANT, u, 0.01, rng)), (2, 2, 5))
        known = {**fit.parameters, "K": fit.derived["K"]}
        inside.append([known[k].ci95[0] <= v <= known[k].ci95[1] for k, v in true.items()])  # type: ignore[operator]
    assert np.mean(inside, axis=0) == pytest.approx(0.95 * np.ones(5), abs=0.06)


def test_the_search_finds_the_delay_and_says_how_well() -> None:
    u = random_binary(3000, seed=9)
    y = with_arx_noise(PLANT, u, 0.005, np.random.default_rng(9))
    fit = fit_arx(record_of(u, y))
    assert fit.model.delay == 5
    low, high = fit.derived["L"].ci95
    assert low is not None
    assert high is not None
    assert low <= 0.2 < high
    assert fit.profile is not None
    assert fit.profile.ratio.min() == 1.0
    assert fit.statistics.whiteness_p is not None
    assert fit.statistics.whiteness_p > 0.001


def test_fit_percent_is_of_the_simulation() -> None:
    u = random_binary(3000, seed=10)
    noisy = PLANT.simulate(u) + 0.5 * np.random.default_rng(10).standard_normal(3000)
    fit = fit_arx(record_of(u, noisy), (1, 1, 5))
    used = ~np.isnan(fit.simulated)
    y, y_model = noisy[used], fit.simulated[used]
    expected = 100.0 * (1.0 - np.linalg.norm(y - y_model) / np.linalg.norm(y - y.mean()))
    assert fit.statistics.fit_percent == pytest.approx(expected)
    assert fit.statistics.rms_residual == pytest.approx(float(np.sqrt(np.mean((y - y_model) ** 2))))
    again = fit.model.simulate(u - u.mean()) + noisy.mean()
    assert y_model[500:] == pytest.approx(again[used][500:], abs=0.02)
    assert "residuals-coloured" in {f.code for f in fit.findings}  # output noise is not an ARX model's own


def test_an_integrating_plant_has_no_bounded_gain() -> None:
    u = random_binary(600, seed=11)
    y = np.cumsum(0.01 * u) + 0.02 * np.cumsum(np.random.default_rng(11).standard_normal(600))
    fit = fit_arx(record_of(u, y), (1, 1, 1))
    assert fit.derived["K"].std is None
    assert fit.derived["K"].ci95 == (None, None)


def test_the_public_names_give_the_same_model_and_tune_it() -> None:
    u = random_binary(3000, seed=14)
    record = record_of(u, with_arx_noise(PLANT, u, 0.01, np.random.default_rng(14)))
    fit = ident.fit(record, "arx", orders=(2, 2, 5))
    assert fit.name == "arx"
    assert isinstance(fit.model, ident.Arx)
    assert fit.model == fit_arx(record, (2, 2, 5)).model
    assert fit.covariance.names == ("a1", "a2", "b1", "b2")
    tuning = ident.tune(fit, Ms=1.6)
    assert max(tuning.margins.Ms, tuning.margins.Mt) == pytest.approx(1.6, rel=1e-3)  # type: ignore[type-var]
    with pytest.raises(ident.Refused) as error:
        ident.fit(record, "fopdt", orders=(2, 2, 5))
    assert error.value.code == "orders-without-arx"


# What is refused


def test_irregular_rows_have_no_arx_model() -> None:
    rng = np.random.default_rng(12)
    t = np.cumsum(rng.uniform(0.5, 1.5, 500))
    with pytest.raises(ident.NotIdentifiable) as error:
        fit_arx(ident.LoopRecord(t, random_binary(500), rng.standard_normal(500)))
    assert error.value.code == "irregular-sampling"
    assert "sample time" in error.value.message


@pytest.mark.parametrize("orders", [(1, 1, 0), (-1, 1, 1), (1, 0, 1), (1, 1), (1, 1, 1.5), (1, 1, "x"), 3, (2, 2, 101)])
def test_impossible_orders_are_refused(orders: object) -> None:
    with pytest.raises(ident.Refused) as error:
        fit_arx(record_of(random_binary(300), random_binary(300)), orders)  # type: ignore[arg-type]
    assert error.value.code == "orders-out-of-range"


@pytest.mark.parametrize(
    "what", ["short", "constant command", "constant speed", "noise only", "too many orders", "runaway"]
)
def test_a_log_that_cannot_carry_the_model_is_refused(what: str) -> None:
    rng = np.random.default_rng(13)
    u, y = random_binary(1000), rng.standard_normal(1000)
    orders = None
    if what == "short":
        u, y = np.tile([0.0, 0.0, 1.0, 1.0], 5), y[:20]
    if what == "constant command":
        u = np.full(1000, 30.0)
    if what == "constant speed":
        y = np.full(1000, 900.0)
    if what == "too many orders":  # a first-order plant without noise: common factors would be free
        y, orders = Arx([-0.9], [0.1], 1, H).simulate(u), (2, 2, 1)
    if what == "runaway":
        y, orders = Arx([-1.002], [0.1], 1, H).simulate(u), (1, 1, 1)
    with pytest.raises(ident.NotIdentifiable) as error:
        fit_arx(record_of(u, y), orders)
    assert error.value.code == ("too-short" if what == "short" else "not-identifiable")
