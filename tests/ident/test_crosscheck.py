"""The cross-check: plain regressions as reference, agreement where the model is right, findings where it is not."""

from __future__ import annotations

import sys
from dataclasses import replace
from types import SimpleNamespace

import control
import numpy as np
import pytest
from scipy.signal import cont2discrete, lfilter

import ident
from ident.estimate.arx import fit_arx
from ident.estimate.lagged import even_runs
from ident.judge.crosscheck import CrossChecks, cross_check
from ident.judge.high_order import high_order
from ident.judge.steps import settling_step
from ident.plants import Fopdt
from ident.plants.arx import Arx
from tests.reference.held_fopdt import respond

H = 0.01


def random_binary(n: int, hold: int = 40, seed: int = 0) -> np.ndarray:
    return np.repeat(np.random.default_rng(seed).choice([-1.0, 1.0], n // hold + 1), hold)[:n]


def record_of(u: np.ndarray, y: np.ndarray) -> ident.LoopRecord:
    return ident.LoopRecord(H * np.arange(len(u)), u, y)


def codes(found: CrossChecks) -> set[str]:
    return {f.code for f in found.findings}


# Its parts


@pytest.mark.parametrize("stride", [1, 3])
def test_lagged_products_give_the_plain_regression(stride: int) -> None:
    rng = np.random.default_rng(1)
    n, na, nb = 900, 4, 6
    u = random_binary(n, 5)
    y = respond(u, H, 2.0, 0.1, 0.02) + 0.1 * rng.standard_normal(n)
    keep = np.ones(n, bool)
    keep[500:530] = False
    record = ident.LoopRecord(H * np.arange(n)[keep], u[keep], y[keep])
    found = high_order(even_runs(record), na, nb, stride)
    assert found is not None
    X, target = [], []
    for a, b in ((0, 500), (530, n)):
        mean = np.array([u[k : k + stride].mean() for k in range(a, b)])
        for k in range(max(na, nb) * stride, b - a):
            past = [-y[a + k - i * stride] for i in range(1, na + 1)]
            X.append([*past, *(mean[k - j * stride] for j in range(1, nb + 1)), 1.0])
            target.append(y[a + k])
    plain, *_ = np.linalg.lstsq(np.array(X), np.array(target), rcond=None)
    assert np.concatenate((found.a, found.b)) == pytest.approx(plain[:-1], abs=1e-7)
    e = np.array(target) - np.array(X) @ plain
    dof = len(target) - stride * len(plain)
    covariance = np.linalg.inv(np.array(X).T @ np.array(X)) * (e @ e) * stride / dof
    assert np.sqrt(np.diag(found.covariance)) == pytest.approx(np.sqrt(np.diag(covariance))[:-1], rel=1e-6)


def test_step_response_and_its_std_are_first_order_statistics() -> None:
    rng = np.random.default_rng(2)
    u = random_binary(1500, 5)
    found = high_order(even_runs(record_of(u, respond(u, H, 2.0, 0.1, 0.0) + 0.1 * rng.standard_normal(1500))), 3, 25)
    assert found is not None
    value, std = found.step_response(20)
    system = control.tf([*found.b], [1.0, *found.a, *np.zeros(22)], H)
    steps = control.step_response(system, H * np.arange(20))
    assert value == pytest.approx(np.asarray(steps.outputs).ravel(), abs=1e-9)
    theta = np.concatenate((found.a, found.b))
    slopes = np.empty((28, 20))
    for i in range(28):
        moved = []
        for sign in (1.0, -1.0):
            t = theta.copy()
            t[i] += sign * 1e-6
            moved.append(replace(found, a=t[:3], b=t[3:]).step_response(20)[0])
        slopes[i] = (moved[0] - moved[1]) / 2e-6
    assert std == pytest.approx(np.sqrt(np.sum(slopes * (found.covariance @ slopes), axis=0)), rel=1e-5)
    w = np.array([1.0, 20.0, 200.0])
    size, _ = found.gain_at(w)
    assert size == pytest.approx(np.abs(system(np.exp(1j * H * w))), rel=1e-9)


@pytest.mark.parametrize("plant", [Fopdt(2.0, 0.5, 0.1053), Fopdt(-3.0, 0.05, 0.0), Fopdt(2.0, 10.0, 0.5)])
def test_the_step_of_any_response_is_the_closed_form(plant: Fopdt) -> None:
    found = settling_step(plant, H, 10_000)
    t = H * np.arange(len(found))
    expected = np.where(t > plant.L, plant.K * -np.expm1(-(t - plant.L) / plant.T), 0.0)
    assert found == pytest.approx(expected, abs=1e-3 * abs(plant.K))
    assert t[-1] == pytest.approx(plant.L + plant.T * np.log(50.0), abs=0.02 * plant.T + 2 * H)  # within 2 %


def test_the_step_of_a_ringing_plant_lasts_until_it_is_still() -> None:
    w0, zeta = 5.0, 0.05
    system = control.tf([w0**2], [1.0, 2 * zeta * w0, w0**2])
    ringing = SimpleNamespace(static_gain=1.0, frequency_response=lambda w: system(1j * np.asarray(w)))
    found = settling_step(ringing, H, 3000)
    expected = control.step_response(system, H * np.arange(len(found)))
    assert found == pytest.approx(np.asarray(expected.outputs).ravel(), abs=2e-3)
    assert len(found) * H > 12.0  # ln(50)/(zeta w0) = 15.6 s at most


# The whole


@pytest.mark.parametrize(("T", "seed"), [(0.1, 3), (0.25, 4), (1.0, 5)])
def test_a_right_model_agrees_within_the_bound(T: float, seed: int) -> None:
    u = random_binary(6000, max(int(T / H), 20))
    y = respond(u, H, 2.0, T, 0.1053) + 0.1 * np.random.default_rng(seed).standard_normal(6000)
    record = record_of(u, y)
    found = cross_check(record, ident.fit(record, "fopdt"))
    assert [c.method for c in found.checks] == ["high-order-arx", "subspace"]
    for check in found.checks:
        assert check.agreement_percent > 98.0
        assert check.max_difference_percent < 5.0
    assert found.checks[0].bound_percent is not None
    assert found.checks[0].max_difference_percent < found.checks[0].bound_percent
    assert found.findings == ()


def test_a_right_model_agrees_in_closed_loop_with_a_negative_gain() -> None:
    rng = np.random.default_rng(6)
    n, plant = 6000, Arx([-0.96], [-0.05, -0.03], 6, H)
    r, u, y, e = random_binary(n, 300, 6), np.zeros(n), np.zeros(n), 0.005 * rng.standard_normal(n)
    integral = 0.0
    for k in range(n):
        y[k] = (0.96 * y[k - 1] if k else 0.0) - (0.05 * u[k - 6] + 0.03 * u[k - 7] if k >= 7 else 0.0) + e[k]
        integral += -0.1 * H / 0.3 * (r[k] - y[k])
        u[k] = -0.1 * (r[k] - y[k]) + integral
    record = record_of(u, y)
    fit = fit_arx(record, (1, 2, 6))
    assert fit.model.static_gain == pytest.approx(plant.static_gain, rel=0.02)
    found = cross_check(record, fit, subspace=False)
    assert found.checks[0].max_difference_percent < max(found.checks[0].bound_percent or 0.0, 5.0)
    assert "models-disagree" not in codes(found)


def test_a_wrong_model_is_found_out() -> None:
    u = random_binary(6000)
    y = respond(u, H, 2.0, 0.25, 0.1) + 0.05 * np.random.default_rng(7).standard_normal(6000)
    record = record_of(u, y)
    fit = ident.fit(record, "fopdt")
    wrong = replace(fit, model=Fopdt(2.0, 0.4, 0.1))
    found = cross_check(record, wrong)
    assert [f.evidence["method"] for f in found.findings if f.code == "models-disagree"] == [
        "high-order-arx",
        "subspace",
    ]
    # Against exp(-t/T): at most 100 |exp(-t/0.4) - exp(-t/0.25)|, which is 17.4 % at t = 0.31 s.
    assert found.checks[0].max_difference_percent == pytest.approx(17.4 / 0.98, abs=1.5)
    assert found.checks[0].at_s == pytest.approx(0.41, abs=0.12)


def test_a_swinging_shaft_is_suspected_and_a_stiff_one_is_not() -> None:
    w0, zeta = 60.0, 0.02
    numerator, denominator, _ = cont2discrete(([w0**2], [1.0, 2 * zeta * w0, w0**2]), H)
    u = random_binary(8000, 25)
    noise = 0.05 * np.random.default_rng(8).standard_normal(8000)
    stiff = respond(u, H, 2.0, 1.0, 0.0) + noise
    assert "resonance-suspected" not in codes(
        cross_check(record_of(u, stiff), ident.fit(record_of(u, stiff), "fopdt"), subspace=False)
    )
    swinging = record_of(u, stiff + 0.02 * lfilter(numerator[0], denominator, u))
    found = cross_check(swinging, ident.fit(swinging, "fopdt"), subspace=False)
    (peak,) = [f for f in found.findings if f.code == "resonance-suspected"]
    assert peak.evidence["frequency_rad_s"] == pytest.approx(60.0, rel=0.05)
    assert peak.evidence["frequency_Hz"] == pytest.approx(60.0 / (2 * np.pi), rel=0.05)
    assert peak.evidence["damping_ratio"] == pytest.approx(zeta, abs=0.04)
    # 0.02 / (2 zeta) = 0.5 high, the slow plant adding 0.033 to it; its static gain is 2.02. Noise on the speed
    # pulls the poles of an ARX model inwards, so the height is a lower reading.
    assert peak.evidence["height_over_static_gain"] == pytest.approx(0.5 / 2.02, rel=0.25)


def test_chance_seldom_makes_a_finding() -> None:
    seen = []
    for seed in range(25):
        rng = np.random.default_rng(seed)
        u = random_binary(1500, 30, seed)
        record = record_of(u, respond(u, H, 2.0, 0.2, 0.05) + 0.3 * rng.standard_normal(1500))
        seen.append(len(cross_check(record, ident.fit(record, "fopdt"), subspace=False).findings))
    assert np.mean(np.array(seen) > 0) <= 0.08


def test_a_long_log_is_judged_where_its_command_moves() -> None:
    u = np.concatenate((np.zeros(30_000), random_binary(6000)))
    y = respond(u, H, 2.0, 0.1, 0.05) + 0.1 * np.random.default_rng(12).standard_normal(36_000)
    found = cross_check(record_of(u, y), ident.fit(record_of(u, y), "fopdt"))
    assert [c.method for c in found.checks] == ["high-order-arx", "subspace"]
    assert found.checks[1].agreement_percent > 98.0


# What does not work out


def test_irregular_rows_get_no_cross_check() -> None:
    rng = np.random.default_rng(9)
    t = np.cumsum(rng.uniform(0.5, 1.5, 800)) * H
    u = random_binary(800)
    record = ident.LoopRecord(t, u, respond(u, H, 2.0, 0.2, 0.0))
    found = cross_check(record, ident.fit(record, "fopdt"))
    assert found.checks == ()
    assert codes(found) == {"crosscheck-failed"}


def test_a_short_log_gets_no_cross_check() -> None:
    u = random_binary(60, 12, 3)
    record = record_of(u, respond(u, H, 2.0, 0.02, 0.0) + 0.01 * np.random.default_rng(10).standard_normal(60))
    found = cross_check(record, ident.fit(record, "fopdt"))
    assert found.checks == ()
    assert [f.code for f in found.findings] == ["crosscheck-failed", "crosscheck-failed"]


@pytest.mark.parametrize("failure", [SystemExit("bad input"), ValueError("singular"), ImportError("absent")])
def test_a_failing_library_never_fails_a_report(
    failure: BaseException, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def identify(*_: object, **__: object) -> None:
        print("noise that must not reach the output")
        raise failure

    monkeypatch.setitem(sys.modules, "sippy_unipi", SimpleNamespace(system_identification=identify))
    u = random_binary(2000)
    record = record_of(u, respond(u, H, 2.0, 0.1, 0.0) + 0.01 * np.random.default_rng(11).standard_normal(2000))
    found = cross_check(record, ident.fit(record, "fopdt"))
    assert [c.method for c in found.checks] == ["high-order-arx"]
    (finding,) = found.findings
    assert finding.code == "crosscheck-failed"
    assert str(failure) in str(finding.evidence["reason"])
    assert capsys.readouterr().out == ""


def test_the_library_is_loaded_only_when_asked() -> None:
    import subprocess

    script = "import sys, ident, ident.judge.crosscheck; sys.exit('sippy_unipi' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", script], timeout=60).returncode == 0
