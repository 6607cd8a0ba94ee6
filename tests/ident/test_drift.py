"""Drift: thresholds from published tables, rates on simulated estimates, and what each verdict means."""

from __future__ import annotations

import json
from dataclasses import asdict, replace

import numpy as np
import pytest

import ident
from ident.watch.compare import along, joint
from ident.watch.level import level
from tests.reference.nightly import H, Loop, closed_loop

K, T, L = 14.6, 1.83, 0.37
INSTALLED = ident.PidSettings(0.075, 2.3)
BARE = ident.PracticalSize(0.0, 0.0, 0.0, 0.0, 0.0)  # statistics alone: no size to exceed, no repeatability


def night(K: float = K, T: float = T, L: float = L, share: float = 0.005) -> ident.Night:
    """A night whose K and T are known to `share`, its L to that share of T."""
    variances = np.diag(np.square([share * K, share * T, share * T]))
    return ident.Night(K, T, L, tuple(tuple(float(v) for v in row) for row in variances), "rpm/%")


def drift(baseline: list[ident.Night], tonight: ident.Night | None, **options: object) -> ident.Drift:
    return ident.drift(baseline, tonight, settings=INSTALLED, period=0.1, **options)  # type: ignore[arg-type]


# Thresholds. Tables: NIST/SEMATECH e-Handbook of Statistical Methods, 1.3.6.7.2 (t), .3 (F), .4 (chi-squared).


def test_with_one_night_the_thresholds_are_chi_squared() -> None:
    found = drift([night()], night(), significance=0.001)
    assert found.threshold == pytest.approx(16.266, abs=5e-4)
    assert [p.threshold for p in found.parameters.values()] == [pytest.approx(10.828, abs=5e-4)] * 4


def test_statistic_is_the_squared_change_over_both_variances() -> None:
    a, b = night(L=0.37), night(L=0.40)
    found = drift([a], b, practical=BARE)
    expected = 0.03**2 / (2 * (0.005 * T) ** 2)
    # No night is taken as known beyond nine digits.
    assert found.statistic == pytest.approx(expected, rel=1e-6)
    assert found.parameters["L"].statistic == pytest.approx(expected, rel=1e-6)
    assert found.parameters["K"].statistic == pytest.approx(0.0, abs=1e-9)
    assert found.p == pytest.approx(0.1475, abs=2e-3)  # chi-squared of 5.37, 3 degrees: between 0.1 (6.251) and 0.2


def test_scatter_alone_is_hotellings_limit_for_a_future_observation() -> None:
    # NIST e-Handbook 6.5.4.3: d'S^-1 d held to p (m + 1)(m - 1)/(m^2 - m p) F(p, m - p); F(0.01; 3, 5) = 12.060.
    rng = np.random.default_rng(1)
    m = 8
    z, tonight = rng.standard_normal((m, 3)), np.array([2.0, -1.0, 0.5])
    nothing = np.tile(1e-12 * np.eye(3), (m, 1, 1))
    found = joint(tonight, nothing[0], level(z, nothing), 0.01)
    away = tonight - z.mean(axis=0)
    per_m = (m + 1) / m
    assert found.statistic * per_m == pytest.approx(float(away @ np.linalg.solve(np.cov(z.T), away)), rel=1e-6)
    assert found.threshold * per_m == pytest.approx(3 * (m + 1) * (m - 1) / (m**2 - 3 * m) * 12.060, rel=1e-4)


def test_one_parameter_on_scatter_alone_is_students_t() -> None:
    assert along(1.0, 2.0, 2.0, 7.0, 0.01).threshold == pytest.approx(3.499**2, rel=1e-3)  # t, 7 degrees, 0.995
    assert along(1.0, 2.0, 0.0, 7.0, 0.01).threshold == pytest.approx(2.576**2, rel=1e-3)  # nothing estimated: normal


@pytest.mark.parametrize(("nights", "scatter"), [(1, 0.0), (3, 0.0), (6, 1.0), (12, 4.0)])
def test_rate_of_false_alarms_on_normal_estimates(nights: int, scatter: float) -> None:
    """z ~ N(0, D_i + X): the rate is the nominal one, or lower where truncating the scatter at 0 costs power."""
    rng, runs, alarms = np.random.default_rng(2), 2000, 0
    shape = np.array([[1.0, 0.6, 0.0], [0.6, 1.0, -0.5], [0.0, -0.5, 1.0]])
    for _ in range(runs):
        poor = rng.uniform(0.5, 2.0, nights + 1)  # nights are not equally good
        known = poor[:, None, None] * shape
        z = rng.multivariate_normal(np.zeros(3), shape, nights + 1) * np.sqrt(poor)[:, None]
        z[:, 1] += np.sqrt(scatter) * rng.standard_normal(nights + 1)
        alarms += joint(z[-1], known[-1], level(z[:-1], known[:-1]), 0.05).significant
    # 2000 runs know 5 % to 0.5 % (one sigma).
    low = 0.038 if nights == 1 else 0.01
    assert low <= alarms / runs <= 0.062


# Verdicts.


@pytest.mark.parametrize(
    ("change", "names"),
    [
        ({"K": 1.2 * K}, {"K", "K/T"}),
        ({"K": K / 1.2}, {"K", "K/T"}),
        ({"T": 1.25 * T}, {"T", "K/T"}),
        ({"L": 0.6}, {"L"}),
        ({"K": -K}, {"K", "K/T"}),
    ],
)
def test_a_move_is_called_by_its_parameter(change: dict[str, float], names: set[str]) -> None:
    found = drift([night()] * 3, night(**change))
    assert found.verdict == "moved"
    assert {name for name, p in found.parameters.items() if p.verdict == "moved"} == names


def test_a_change_below_practical_size_is_no_move_however_well_it_is_known() -> None:
    found = drift([night(share=1e-4)] * 2, night(K=1.06 * K, share=1e-4))
    assert found.statistic is not None
    assert found.threshold is not None
    assert found.statistic > found.threshold
    assert found.verdict == "not-moved"
    assert drift([night()], night(K=1.06 * K), practical=ident.PracticalSize(K=0.04)).verdict == "moved"


@pytest.mark.parametrize("poor", [None, night(share=0.06)])
def test_a_night_that_could_not_show_a_move_is_no_news(poor: ident.Night | None) -> None:
    found = drift([night()] * 3, poor)
    assert found.verdict == "no-news"
    assert {p.verdict for p in found.parameters.values()} == {"no-news"}
    assert found.margin is not None
    assert found.margin.Ms_baseline is not None
    assert (found.margin.Ms_now is None) == (poor is None)


def test_a_poor_night_still_shows_a_large_move() -> None:
    assert drift([night()] * 3, night(K=2.0 * K, share=0.04)).verdict == "moved"


def test_a_night_blind_for_the_gain_calls_no_dead_time() -> None:
    dim = replace(night(L=0.6), covariance=((2.0, 0.0, 0.0), (0.0, 0.3, 0.0), (0.0, 0.0, 1e-4)))
    found = drift([night()] * 3, dim)
    assert found.statistic is not None
    assert found.threshold is not None
    assert found.statistic > found.threshold
    assert (found.verdict, found.parameters["L"].verdict) == ("no-news", "no-news")


def test_one_parameter_may_be_dark_on_a_night_with_news() -> None:
    given = replace(night(), covariance=((0.005, 0.0, 0.0), (0.0, 0.25, 0.0), (0.0, 0.0, 0.0004)))
    found = drift([night()] * 3, given)
    assert (found.verdict, found.parameters["K"].verdict) == ("not-moved", "not-moved")
    assert (found.parameters["T"].verdict, found.parameters["K/T"].verdict) == ("no-news", "no-news")


def integrating(ratio: float, T: float) -> ident.Night:
    """K/T known to 1 %, K and T each by an order of magnitude only."""
    K, logs = ratio * T, np.array([[9.0, 9.0, 0.0], [9.0, 9.0 + 1e-4, 0.0], [0.0, 0.0, 1e-4]])
    matrix = np.diag([K, T, 1.0]) @ logs @ np.diag([K, T, 1.0])
    return ident.Night(K, T, 0.5, tuple(map(tuple, matrix.tolist())))


def test_an_integrating_plant_is_watched_by_its_ratio() -> None:
    baseline = [integrating(3.0, T) for T in (900.0, 4000.0, 300.0)]
    same, other = drift(baseline, integrating(3.02, 150.0)), drift(baseline, integrating(3.6, 1200.0))
    assert (same.verdict, other.verdict) == ("not-moved", "moved")
    assert {n: p.verdict for n, p in same.parameters.items()} == {
        "K": "no-news",
        "T": "no-news",
        "L": "not-moved",
        "K/T": "not-moved",
    }
    assert {n for n, p in other.parameters.items() if p.verdict == "moved"} == {"K/T"}


def test_scatter_between_baseline_nights_absorbs_what_covariances_do_not_say() -> None:
    # Nights of an undermodelled plant: T and L trade places by far more than their covariances.
    trade = [(-0.25, 0.12), (0.2, -0.1), (0.1, -0.05), (-0.15, 0.08), (0.22, -0.12), (-0.05, 0.03)]
    nights = [night(T=T + dT, L=L + dL, share=0.002) for dT, dL in trade]
    tonight = night(T=T + 0.3, L=L - 0.16, share=0.002)
    assert drift(nights[:1], tonight).verdict == "moved"
    assert drift(nights, tonight).verdict != "moved"
    assert drift(nights, replace(tonight, K=1.25 * K)).parameters["K"].verdict == "moved"


def test_what_one_baseline_night_cannot_know_of_a_misfit_is_no_alarm() -> None:
    def short(share: float, misfit: bool) -> ident.Night:
        return replace(night(T=(1.0 + share) * T), misfit=misfit)

    assert drift([short(0.0, False)], short(0.25, False)).verdict == "moved"
    found = drift([short(0.0, True)], short(0.25, True))
    assert found.verdict == "no-news"
    assert {(f.code, f.severity) for f in found.findings} == {("few-baseline-nights", "warning")}
    # Eight nights that agree know it.
    assert drift([short(0.0, True)] * 8, short(0.25, True)).verdict == "moved"


def test_verdicts_do_not_depend_on_units_or_on_the_order_of_the_baseline() -> None:
    baseline = [night(K=k * K, T=t * T) for k, t in ((1.0, 1.0), (1.01, 0.97), (0.98, 1.02), (1.0, 1.01))]
    tonight = night(K=0.8 * K)
    per_s = np.diag([np.pi / 30, 1.0, 1.0])

    def in_rad(n: ident.Night) -> ident.Night:
        matrix = per_s @ np.array(n.covariance) @ per_s
        return replace(n, K=n.K * np.pi / 30, covariance=tuple(map(tuple, matrix.tolist())), gain_unit="rad/s/%")

    here = drift(baseline, tonight)
    there = ident.drift([in_rad(n) for n in baseline], in_rad(tonight))
    assert there.statistic == pytest.approx(here.statistic, rel=1e-9)
    assert there.threshold == pytest.approx(here.threshold, rel=1e-9)
    assert drift(baseline[::-1], tonight).statistic == pytest.approx(here.statistic, rel=1e-9)


# Nights, from fits and from stored reports.


def fitted() -> ident.Fit:
    r = np.where(np.arange(600) % 300 < 100, 600.0, 690.0)[:, None]
    u, y = closed_loop(Loop(), r, np.random.default_rng(6))
    return ident.fit(ident.LoopRecord(H * np.arange(600), u[:, 0], y[:, 0], r[:, 0]), "fopdt")


def test_a_night_comes_back_from_a_stored_report() -> None:
    fit = fitted()
    stored = json.loads(
        json.dumps({"p": {n: asdict(e) for n, e in fit.parameters.items()}, "c": asdict(fit.covariance)})
    )
    again = ident.Night.from_values(
        {n: e["value"] for n, e in stored["p"].items()},
        stored["c"]["names"],
        stored["c"]["matrix"],
        gain_unit=stored["p"]["K"]["unit"],
        input_correlation_p=fit.statistics.input_correlation_p,
    )
    assert again == ident.Night.of(fit)
    assert ident.drift([fit], fit).verdict == "not-moved"


@pytest.mark.parametrize(
    ("call", "code"),
    [
        (lambda: drift([], night()), "no-baseline"),
        (lambda: drift([night(), night(K=-K)], night()), "baseline-disagrees"),
        (lambda: drift([night()], replace(night(), gain_unit="rad/s/%")), "gain-units-differ"),
        (lambda: drift([night(), replace(night(), gain_unit="rad/s/%")], night()), "gain-units-differ"),
        (lambda: drift([night()], night(), significance=0.0), "significance-out-of-range"),
        (lambda: ident.PracticalSize(K=-0.1), "practical-out-of-range"),
        (lambda: night(T=0.0), "night-unusable"),
        (lambda: replace(night(), covariance=((1.0,),)), "night-unusable"),
        (lambda: ident.Night.from_values({"K": 1, "T": 1, "L": 0}, "KTL", [[None] * 3] * 3), "night-unusable"),
        (lambda: ident.Night.from_values({"K": 1, "T1": 1, "L": 0}, "KTL", [[1.0] * 3] * 3), "night-not-first-order"),
    ],
)
def test_refusals_have_their_code(call: object, code: str) -> None:
    with pytest.raises(ident.Refused) as error:
        call()  # type: ignore[operator]
    assert error.value.code == code


# History.


def test_history_is_the_same_in_any_order_and_tells_since_when() -> None:
    fell = night(K=0.8 * K)
    nights = [
        ("2026-11-20", night(K=0.79 * K)),
        ("2026-11-21", night()),
        ("2026-11-22", fell),
        ("2026-11-23", None),
        ("2026-11-24", night(K=0.78 * K)),
    ]
    found = ident.drift_history([night()] * 2, nights, settings=INSTALLED)
    assert [(key, d.verdict, d.since) for key, d in found] == [
        ("2026-11-20", "moved", "2026-11-20"),
        ("2026-11-21", "not-moved", None),
        ("2026-11-22", "moved", "2026-11-22"),
        ("2026-11-23", "no-news", "2026-11-22"),
        ("2026-11-24", "moved", "2026-11-22"),
    ]
    assert found[-1][1].parameters["K"].since == "2026-11-22"
    assert found[-1][1].parameters["L"].since is None
    assert ident.drift_history([night()] * 2, [nights[i] for i in (3, 0, 4, 2, 1)], settings=INSTALLED) == found
    alone = ident.drift([night()] * 2, nights[-1][1], settings=INSTALLED)
    assert found[-1][1].margin == alone.margin


def test_a_night_with_dry_friction_is_not_compared_with_nights_without() -> None:
    plain = [night(14.6 + 0.01 * i, 1.8, 0.4) for i in range(5)]
    rubbing = replace(night(22.0, 2.6, 0.4), rubbing=True)
    found = ident.drift(plain, rubbing)
    assert found.verdict == "no-news"
    assert {p.verdict for p in found.parameters.values()} == {"no-news"}
    assert "friction-in-one-only" in {f.code for f in found.findings}
    assert ident.drift([replace(n, rubbing=True) for n in plain], rubbing).verdict == "moved"
    with pytest.raises(ident.Refused, match="some of the baseline's nights only"):
        ident.drift([*plain, rubbing], plain[0])
