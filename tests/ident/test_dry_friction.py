"""Dry friction: found where there is some, nowhere else; checked against exact solutions of Coulomb's law."""

from __future__ import annotations

import dataclasses
from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import solve_ivp

import ident
from tests.benchmarks.friction import WITH, WITHOUT, Case, H, K, L, T, command, record
from tests.reference.dry_friction import respond


def log(seed: int, forward: float, backward: float, noise: float, *, levels: bool = True) -> ident.LoopRecord:
    rng = np.random.default_rng(seed)
    u = command(rng, levels)
    return record(respond(u, H, K, T, L, forward, backward), u, noise, rng)


def test_the_reference_agrees_with_numerical_integration() -> None:
    # scipy.integrate.solve_ivp; tanh of the speed over a thousandth of its size in place of its sign.
    u = np.repeat([0.0, 1.0, -0.8, 0.2, 0.9], 60)
    exact = respond(u, H, K, T, L, 0.3, 0.4)

    def rate(t: float, y: np.ndarray) -> np.ndarray:
        held = u[max(int((t - L) / H + 1e-9), 0)]
        resists = np.where(y > 0.0, 0.3, 0.4) * np.tanh(y / 1e-3)
        return np.asarray((K * (held - resists) - y) / T)

    times = H * np.arange(len(u))
    numeric = solve_ivp(rate, (0.0, times[-1]), [0.0], t_eval=times, method="LSODA", max_step=H / 4, rtol=1e-8).y[0]
    assert np.abs(exact - numeric).max() < 0.004
    assert np.count_nonzero(exact == 0.0) > 30  # it stands for a while


@pytest.mark.parametrize("levels", [True, False])
def test_without_noise_the_motor_comes_back(levels: bool) -> None:
    fit = ident.fit(log(1, 0.35, 0.25, 0.0, levels=levels), "fopdt")
    assert fit.friction is not None
    # The direction is held at its mean over the sample in which it turns: a second-order error in h/T.
    found = (fit.model.static_gain, fit.parameters["T"].value, fit.friction.forward.value, fit.friction.backward.value)
    assert found == pytest.approx((K, T, 0.35, 0.25), rel=3e-3)
    assert fit.model.dead_time == pytest.approx(L, abs=0.05 * H)


@pytest.mark.parametrize("c", WITH, ids=lambda c: c.name)
def test_the_truth_lies_within_wide_intervals(c: Case) -> None:
    fit = ident.fit(log(7, c.forward, c.backward, c.noise, levels=c.levels))
    assert fit.friction is not None
    for estimate, true in (
        (fit.parameters["K"], K),
        (fit.parameters["T"], T),
        (fit.friction.forward, c.forward),
        (fit.friction.backward, c.backward),
    ):
        assert estimate.std is not None
        assert abs(estimate.value - true) < 4.0 * estimate.std
        assert estimate.std < 0.03 * true
    assert fit.friction.forward.unit == "V"
    assert "dry-friction" in {f.code for f in fit.findings}


@pytest.mark.parametrize("plant", WITHOUT)
@pytest.mark.parametrize("seed", [3, 4])
def test_no_friction_is_claimed_where_there_is_none(plant: str, seed: int) -> None:
    rng = np.random.default_rng(seed)
    u = command(rng, True)
    fit = ident.fit(record(WITHOUT[plant](u), u, 0.05, rng))
    assert fit.friction is None
    assert ("gain-varies-with-level" in {f.code for f in fit.findings}) == (plant == "gain compression")


def test_a_gain_that_falls_with_level_is_not_friction(shared: Path) -> None:
    # datasets/README.md, hoop_motor_random: y/u near 20 at small commands, 10 at large ones; K 11.58, T 1.589 s linear.
    fit = ident.fit(ident.read_csv(shared / "datasets" / "hoop_motor_random.csv"), "fopdt")
    assert fit.friction is None
    assert fit.parameters["K"].value == pytest.approx(11.58, rel=0.03)
    assert fit.parameters["T"].value == pytest.approx(1.589, rel=0.03)
    (varies,) = [f for f in fit.findings if f.code == "gain-varies-with-level"]
    gains = [varies.evidence[f"gain_{i}"] for i in (1, 2, 3)]
    assert gains == sorted(gains, reverse=True)
    assert gains[0] > 2.0 * gains[2]


def test_a_log_in_one_direction_says_nothing_of_friction() -> None:
    both = log(2, 0.3, 0.3, 0.02)
    u = 0.9 + 0.2 * both.command
    y = respond(u, H, K, T, L, 0.3, 0.3)
    fit = ident.fit(ident.LoopRecord(both.time, u, y + 0.01 * np.random.default_rng(1).standard_normal(len(u))))
    assert fit.friction is None
    assert fit.parameters["K"].value == pytest.approx(K, rel=0.02)


def test_a_motor_wired_backwards_has_the_same_friction() -> None:
    forth = log(5, 0.35, 0.25, 0.02)
    back = ident.fit(dataclasses.replace(forth, command=-forth.command), "fopdt")
    there = ident.fit(forth, "fopdt")
    assert back.friction is not None
    assert there.friction is not None
    assert back.parameters["K"].value == pytest.approx(-there.parameters["K"].value, rel=1e-6)
    assert back.friction.forward.value == pytest.approx(there.friction.forward.value, rel=1e-5)
    assert back.friction.backward.value == pytest.approx(there.friction.backward.value, rel=1e-5)


def test_the_report_carries_it_and_other_models_agree() -> None:
    report = ident.analyse(log(5, 0.5, 0.5, 0.05), period=H, subspace=False)
    assert report.selected is not None
    assert report.fits[report.selected].friction is not None
    assert report.recommended is not None
    assert report.cross_checks[0].agreement_percent > 98.0  # high-order ARX, friction taken off: within 2 %
    assert "models-disagree" not in {f.code for f in report.findings}
