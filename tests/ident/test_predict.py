"""Predicted responses against independent simulations and published figures; setpoint weight; proposals."""

from __future__ import annotations

import csv
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy.integrate import solve_ivp

from ident.errors import Refused
from ident.loop import PidSettings, margins
from ident.loop.simulate import Clock, load_step, setpoint_step, zero_order
from ident.plants import Fopdt
from ident.tune import Predicted, choose_setpoint_weight, predict, propose, tune

Floats = NDArray[np.float64]


@pytest.mark.parametrize(
    ("plant", "h", "d", "b0", "b1"),
    [
        (Fopdt(1, 1, 0.35), 0.2, 1, 0.0487705754993, 0.132498671423),
        (Fopdt(2, 0.5, 0.105), 0.01, 10, 0.0199003325017, 0.0197023208848),
        (Fopdt(1.5, 0.8, 0.4), 0.1, 4, 0.176254646123, 0.0),
        (Fopdt(1, 1, 0), 0.1, 0, 0.095162581964, 0.0),
    ],
)
def test_zero_order_hold(plant: Fopdt, h: float, d: int, b0: float, b1: float) -> None:
    # CHECKS.md section 8, modified z-transform: y[k+1] = a y[k] + b0 u[k-d] + b1 u[k-d-1].
    delay, num, den = zero_order(plant, h)
    assert delay == d + 1
    assert num == pytest.approx([b0, b1], abs=1e-12)
    assert den == pytest.approx([1.0, -np.exp(-h / plant.T)], abs=1e-15)


def _method_of_steps(plant: Fopdt, s: PidSettings, r: float, v: float, end: float) -> Callable[[Floats], Floats]:
    """The analogue loop by DOP853, one dead time after the other; states: speed, integral of the error."""
    solutions: list[Any] = []

    def command(t: float) -> float:
        if t < 0 or not solutions:
            return 0.0
        y, integral = solutions[min(int(t / plant.L), len(solutions) - 1)](t)
        return float(s.Kp * (s.b * r - y) + s.Kp / s.Ti * integral)

    state = np.zeros(2)
    for k in range(int(np.ceil(end / plant.L))):
        load = v if k > 0 else 0.0

        def slope(t: float, x: Floats, load: float = load) -> list[float]:
            return [(-x[0] + plant.K * (command(t - plant.L) + load)) / plant.T, r - x[0]]

        span = (k * plant.L, (k + 1) * plant.L)
        part = solve_ivp(slope, span, state, method="DOP853", rtol=1e-9, atol=1e-11, dense_output=True)
        solutions.append(part.sol)
        state = part.y[:, -1]

    def speed(time: Floats) -> Floats:
        return np.array([solutions[min(int(t / plant.L), len(solutions) - 1)](t)[0] for t in time])

    return speed


@pytest.mark.parametrize(
    ("plant", "controller"),
    [
        (Fopdt(1.0, 1.0, 1.0), PidSettings(0.5, 1.0)),
        (Fopdt(-2.0, 1.0, 0.2), PidSettings(-0.95, 0.5, b=0.3)),
        (Fopdt(1.0, 0.2, 1.0), PidSettings(0.3, 0.4)),
    ],
)
def test_analogue_loop_agrees_with_solve_ivp(plant: Fopdt, controller: PidSettings) -> None:
    # Independent: scipy solve_ivp with delayed history. Bar: 1e-4 of the step.
    found = predict(plant, controller)
    for step, r, v in ((found.setpoint_step, 1.0, 0.0), (found.load_step, 0.0, 1.0)):
        time = np.array(step.response.time_s)[::6]
        reference = _method_of_steps(plant, controller, r, v, float(time[-1]))
        assert np.max(np.abs(np.array(step.response.speed)[::6] - reference(time))) < 1e-4


def _digital_by_hand(
    plant: Fopdt, s: PidSettings, h: float, reference: Floats, v: float, compute_delay: float
) -> tuple[Floats, Floats]:
    """The contract's controller in a plain loop; the plant by superposition of exact step responses."""
    n = len(reference)
    t = h * np.arange(n)
    speed = v * plant.K * -np.expm1(-np.maximum(t - plant.L, 0) / plant.T)
    command, integral, last = np.zeros(n), 0.0, 0.0
    for k in range(n):
        error = reference[k] - speed[k]
        integral += s.Kp * h / (2 * s.Ti) * (error + last)
        last = error
        command[k] = s.Kp * (s.b * reference[k] - speed[k]) + integral
        change = command[k] - (command[k - 1] if k else 0.0)
        after = np.maximum(t - t[k] - plant.L - compute_delay, 0)
        speed += change * plant.K * -np.expm1(-after / plant.T)
    return speed, command


@pytest.mark.parametrize(
    ("plant", "controller", "period", "compute_delay"),
    [
        (Fopdt(1.5, 0.8, 0.4), PidSettings(0.6, 0.7, b=0.4), 0.1, 0.0),
        (Fopdt(-1.0, 1.0, 0.33), PidSettings(-1.0, 0.9), 0.05, 0.02),
        (Fopdt(1.0, 1.0, 0.0), PidSettings(1.2, 0.5), 0.2, 0.2),
        (Fopdt(1.0, 1.0, 1.03), PidSettings(0.4, 1.0), 0.01, 0.004),  # long enough for the method of steps
    ],
)
def test_digital_loop_is_exact(plant: Fopdt, controller: PidSettings, period: float, compute_delay: float) -> None:
    n = 400
    ones, zeros = np.ones(n), np.zeros(n)
    got = setpoint_step(plant, controller, Clock(period, n), compute_delay=compute_delay)
    speed, command = _digital_by_hand(plant, controller, period, ones, 0.0, compute_delay)
    assert got.speed == pytest.approx(speed, abs=1e-9)
    assert got.command == pytest.approx(command, abs=1e-9)
    got = load_step(plant, controller, Clock(period, n), compute_delay=compute_delay)
    speed, command = _digital_by_hand(plant, controller, period, zeros, 1.0, compute_delay)
    assert got.speed == pytest.approx(speed, abs=1e-9)
    assert got.command == pytest.approx(command, abs=1e-9)


def test_speed_between_samples_passes_through_the_samples() -> None:
    plant, controller = Fopdt(2.0, 0.3, 0.17), PidSettings(0.2, 0.4)
    for step in (setpoint_step, load_step):
        at = step(plant, controller, Clock(0.2, 60), compute_delay=0.03)
        between = step(plant, controller, Clock(0.2, 60, 8), compute_delay=0.03)
        assert between.speed[::8] == pytest.approx(at.speed, abs=1e-11)
        assert between.time[::8] == pytest.approx(at.time, abs=1e-12)


def test_published_integrated_errors() -> None:
    # CHECKS.md section 1, SIMC with tauc = theta (two simulators there agree to 1e-8).
    found = predict(Fopdt(1, 1, 1), PidSettings(0.5, 1.0))
    assert found.load_step.iae == pytest.approx(2.034997, rel=1e-4)
    assert found.setpoint_step.iae == pytest.approx(2.168691, rel=1e-4)
    assert predict(Fopdt(1, 8, 1), PidSettings(4.0, 8.0)).load_step.iae == pytest.approx(2.0, rel=1e-4)


def test_integrated_errors_of_the_reference_table(shared: Path) -> None:
    # optimum.csv, IAE of PI loops on first-order plants (matrix exponential, Hermite interpolation).
    checked = 0
    with (shared / "checks" / "optimum.csv").open() as file:
        for row in csv.DictReader(file):
            if row["form"] != "PI" or not row["plant"].startswith("FOPDT"):
                continue
            plant = Fopdt(1.0, 1.0, float(row["plant"].removeprefix("FOPDT_L")))
            found = predict(plant, PidSettings(float(row["Kp"]), float(row["Ti"])))
            assert found.load_step.iae == pytest.approx(float(row["IAE"]), rel=3e-4), row
            checked += 1
    assert checked == 40


def test_figures_of_a_response_known_in_closed_form() -> None:
    # K = T = 1, L = 0, Kp = 1, Ti = 1, b = 1: the loop is 1/s, so y = 1 - exp(-t), u = 1 throughout;
    # the load step gives y = t exp(-t), its peak exp(-1) at 1 s, its integral 1.
    found = predict(Fopdt(1, 1, 0), PidSettings(1.0, 1.0))
    s, load = found.setpoint_step, found.load_step
    assert s.overshoot_percent == pytest.approx(0.0, abs=1e-6)
    assert s.rise_time_s == pytest.approx(np.log(9.0), rel=1e-4)
    assert s.settling_time_s == pytest.approx(np.log(50.0), rel=1e-4)
    assert s.iae == pytest.approx(1.0, rel=3e-4)
    assert s.peak_command == pytest.approx(1.0, rel=1e-4)
    assert load.peak_deviation == pytest.approx(np.exp(-1.0), rel=1e-4)
    assert load.peak_time_s == pytest.approx(1.0, abs=0.02)
    assert load.iae == pytest.approx(1.0, rel=2e-3)
    # t exp(1 - t) = 0.05 at t = 5.7439 s (Lambert W, from memory; checked by substitution).
    assert load.recovery_time_s == pytest.approx(5.7439, abs=2e-3)
    assert 5.7439 * np.exp(1 - 5.7439) == pytest.approx(0.05, abs=1e-5)


@settings(max_examples=15, deadline=None)
@given(
    T=st.floats(-3, 2).map(lambda e: 10.0**e),
    ratio=st.floats(-3, 3).map(lambda e: 10.0**e),
    hold=st.sampled_from([0.0, 1e-6, 0.1, 1.0, 5.0]),
)
def test_responses_settle_and_scale(T: float, ratio: float, hold: float) -> None:
    plant, period = Fopdt(1.0, T, T * ratio), T * ratio * hold
    found = tune(plant, period=period)
    p = found.predicted
    assert p is not None
    assert p.setpoint_step.settling_time_s is not None
    assert p.load_step.recovery_time_s is not None
    for response in (p.setpoint_step.response, p.load_step.response):
        assert 2 <= len(response.time_s) <= 300
        assert np.all(np.diff(response.time_s) > 0)
    # IE = 1/ki for a unit load (CHECKS.md, conventions), and IAE is never below it.
    assert p.load_step.iae > (1 - 3e-3) / found.settings.ki
    negative = tune(Fopdt(-1.0, T, T * ratio), period=period).predicted
    assert negative is not None
    assert negative.load_step.iae == pytest.approx(p.load_step.iae, rel=1e-6)
    assert negative.setpoint_step.peak_command == pytest.approx(-p.setpoint_step.peak_command, rel=1e-6)


def test_very_short_periods_go_over_into_the_analogue_loop() -> None:
    plant, controller = Fopdt(1.0, 1.0, 0.5), PidSettings(0.8, 0.9)
    short, analogue = predict(plant, controller, period=2e-6), predict(plant, controller)
    assert short.load_step.peak_deviation == pytest.approx(analogue.load_step.peak_deviation, rel=1e-4)
    assert short.setpoint_step.overshoot_percent == pytest.approx(analogue.setpoint_step.overshoot_percent, abs=0.01)


def _overshoot(plant: Fopdt, s: PidSettings, period: float) -> float:
    return predict(plant, s, period=period).setpoint_step.overshoot_percent


@pytest.mark.parametrize(("T", "L", "period"), [(1.0, 1.0, 0.0), (1.0, 0.8, 0.05), (1.0, 3.0, 0.0)])
def test_setpoint_weight_is_the_largest_allowed(T: float, L: float, period: float) -> None:
    plant = Fopdt(-2.0, T, L)
    chosen, finding = choose_setpoint_weight(plant, tune(plant, period=period).settings, period=period)
    assert finding is None
    assert _overshoot(plant, chosen, period) <= 5.0 + 1e-6
    assert chosen.b * 20 == pytest.approx(round(chosen.b * 20))
    if chosen.b < 1:
        assert _overshoot(plant, replace(chosen, b=chosen.b + 0.05), period) > 5.0


def test_ramp_is_advised_where_no_weight_helps() -> None:
    plant, period = Fopdt(1.0, 1.0, 0.02), 0.01
    found = tune(plant, period=period, Ms=2.0)
    assert found.settings.b == 0.0
    assert found.predicted is not None
    assert found.predicted.setpoint_step.overshoot_percent > 5.0
    (finding,) = found.findings
    assert finding.code == "setpoint-ramp-advised"
    ramp = finding.evidence["ramp_s"]
    assert isinstance(ramp, float)
    # The advised ramp, played through the loop by hand.
    reference = np.clip(np.arange(600) * period / ramp, 0.0, 1.0)
    speed, _ = _digital_by_hand(plant, found.settings, period, reference, 0.0, 0.0)
    assert 100 * (speed.max() - 1.0) < 5.1


def test_proposal_recommends_what_meets_the_target() -> None:
    lag = propose(Fopdt(-245.0, 0.12, 0.004), period=0.01)
    chosen, rule = lag.tunings
    assert lag.recommended == 0
    assert chosen.method == "largest-ki"
    assert rule.method == "simc"
    assert [f.code for f in rule.findings] == ["target-missed"]
    assert rule.margins == margins(Fopdt(-245.0, 0.12, 0.004), rule.settings, period=0.01)
    assert "SIMC rule does not" in lag.because

    both = propose(Fopdt(1, 1, 1))
    assert both.recommended == 0
    assert both.tunings[0].settings.ki > both.tunings[1].settings.ki
    assert all(not t.findings for t in both.tunings)
    assert isinstance(both.tunings[1].predicted, Predicted)


@pytest.mark.parametrize(
    ("plant", "controller", "code"),
    [
        (Fopdt(1, 1, 0.2), PidSettings(15.0, 1.0), "loop-unstable"),
        (Fopdt(1, 1, 0.2), PidSettings(1.0, 1.0, 0.1), "derivative-without-filter"),
        (object(), PidSettings(1.0, 1.0), "not-simulated"),
    ],
)
def test_refused(plant: Any, controller: PidSettings, code: str) -> None:
    with pytest.raises(Refused) as caught:
        predict(plant, controller)
    assert caught.value.code == code


def test_what_does_not_settle_when_sampled_is_not_recommended() -> None:
    # Half a period of dead time flatters a PID whose derivative time is a quarter of the period: by hand, with
    # the same backward differences, the sampled loop diverges.
    plant, period = Fopdt(245.0, 0.11, 0.0), 0.01
    proposal = propose(plant, period=period, form="pid", Ms=2.0)
    best, rule = (next(t for t in proposal.tunings if t.method == method) for method in ("largest-ki", "simc"))
    assert best.margins.stable
    assert best.predicted is None
    assert [(f.code, f.severity) for f in best.findings] == [("sampled-loop-unstable", "error")]
    assert proposal.recommended is not None
    assert proposal.tunings[proposal.recommended].predicted is not None
    assert rule.predicted is not None

    s, n = best.settings, 200
    speed, filtered, drift, integral, last, command = 0.0, np.zeros(3), 0.0, 0.0, 0.0, 0.0
    a = np.exp(-period / plant.T)
    history = []
    for _ in range(n):
        x = s.Tf / period
        # y_f + Tf y_f' + Tf^2/2 y_f'' = y, backward differences.
        old, older = filtered[0], filtered[1]
        new = (speed + (x + x**2) * old - x**2 / 2 * older) / (1 + x + x**2 / 2)
        drift = (new - old) / period
        filtered[:] = new, old, older
        error = 1.0 - new
        integral += s.Kp * period / (2 * s.Ti) * (error + last)
        last = error
        command = s.Kp * (s.b - new - s.Td * drift) + integral
        speed = a * speed + plant.K * (1 - a) * command
        history.append(abs(speed))
    assert max(history[-20:]) > 100
