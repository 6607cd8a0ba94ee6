"""The loop with a limited command: the anti-windup reference table, and the linear simulation where nothing limits."""

from __future__ import annotations

import numpy as np
import pytest

from ident.loop import PidSettings
from ident.loop.saturated import AntiWindup, Limited, run_limited
from ident.plants import Fopdt, Sopdt


@pytest.mark.parametrize(
    ("rule", "Tt", "peak", "at", "iae"),
    [
        ("none", None, 1.19452563, 5.39, 1.22889743),
        ("tracking", 1.0, 1.11451607, 2.66, 0.74039471),
        ("tracking", 0.25, 1.02485381, 2.08, 0.65152859),
        ("tracking", 0.1, 1.01337551, 2.12, 0.64510469),
        ("tracking", 0.05, 1.01236546, 2.14, 0.64475049),
        ("conditional", None, 1.01203376, 2.15, 0.64583495),
    ],
)
def test_anti_windup_table(rule: AntiWindup, Tt: float | None, peak: float, at: float, iae: float) -> None:
    # CHECKS.md section 8: 1/(s+1), exact hold, PI Kp 4, Ti 0.25, h 0.01, abs(u) <= 1.2, 600 steps; errors summed
    # after each move of the plant.
    limits = Limited(-1.2, 1.2, rule, Tt)
    found = run_limited(Fopdt(1, 1, 0), PidSettings(4, 0.25), 0.01, np.ones(601), np.zeros(601), limits)
    k = int(np.argmax(found.speed))
    assert found.speed[k] == pytest.approx(peak, abs=6e-9)
    assert found.time[k] == pytest.approx(at, abs=1e-9)
    assert float(np.abs(1 - found.speed[1:]).sum() * 0.01) == pytest.approx(iae, abs=6e-9)
    assert found.at_limit > 0.05


def test_tracking_time_is_ti_unless_given() -> None:
    # Ti is 0.25 here, the third row of the table.
    found = run_limited(Fopdt(1, 1, 0), PidSettings(4, 0.25), 0.01, np.ones(600), np.zeros(600), Limited(-1.2, 1.2))
    assert found.speed.max() == pytest.approx(1.02485381, abs=6e-9)


@pytest.mark.parametrize("plant", [Fopdt(2.0, 0.5, 0.035), Sopdt(1.5, 0.4, 0.1, 0.02)])
def test_a_load_step_without_limits_is_that_of_the_difference_equations(plant: Fopdt | Sopdt) -> None:
    # By hand: the plant behind its hold as python-control samples it, and the same controller in a plain loop.
    control = pytest.importorskip("control")
    h, n, s = 0.01, 300, PidSettings(0.8, 0.4)
    lags = (plant.T,) if isinstance(plant, Fopdt) else (plant.T1, plant.T2)
    den = np.array([1.0])
    for T in lags:
        den = np.convolve(den, [T, 1.0])
    # Fractions of a sample are reached by sampling ten times finer than the controller.
    fine = control.sample_system(control.tf([plant.K], den), h / 10, "zoh")
    A = control.tf2ss(fine)
    x, speed, integral, delay = np.zeros((A.nstates, 1)), [], 0.0, round(plant.L / h * 10)
    line = [0.0] * delay
    for _ in range(n):
        y = (A.C @ x).item()
        speed.append(y)
        u = -s.Kp * y + integral
        integral -= s.Kp * h / s.Ti * y
        for _ in range(10):
            line.append(u + 1.0)
            x = A.A @ x + A.B * line.pop(0)
    found = run_limited(plant, s, h, np.zeros(n), np.ones(n), Limited())
    assert np.abs(found.speed - np.array(speed)).max() < 1e-9


def test_quantised_and_noisy_speed() -> None:
    noise = 0.01 * np.random.default_rng(1).standard_normal(400)
    quiet = run_limited(Fopdt(1, 1, 0.05), PidSettings(2, 0.5), 0.02, np.ones(400), np.zeros(400), Limited())
    coarse = run_limited(
        Fopdt(1, 1, 0.05), PidSettings(2, 0.5), 0.02, np.ones(400), np.zeros(400), Limited(resolution=0.1, noise=noise)
    )
    assert np.abs(np.diff(coarse.command)).sum() > 3 * np.abs(np.diff(quiet.command)).sum()
    assert np.abs(coarse.speed[-100:] - 1).max() < 0.1
