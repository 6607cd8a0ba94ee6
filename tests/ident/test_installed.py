"""The installed controller, recovered from logs of controllers written another way, and from measured ones."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from ident import Fopdt, LoopRecord, PidSettings, analyse, margins
from ident.estimate import Recovered, recover
from ident.loop import ControlLaw, law_margins
from tests.benchmarks.monte_carlo_installed import main
from tests.reference.digital_pid import Motor, Pid, run, steps

MOTOR = Motor()
SETPOINT = steps(2000, ((0, 600.0), (100, 700.0), (500, 640.0), (900, 760.0), (1300, 600.0), (1600, 680.0)))
PI = Pid(Kp=0.075, Ti=2.3)
PID = Pid(Kp=0.12, Ti=2.0, Td=0.25, Tf=0.05)


def logged(pid: Pid, seed: int = 1, motor: Motor = MOTOR, load: float = 0.0) -> LoopRecord:
    command, speed = run(pid, motor, SETPOINT, seed, load=load)
    return LoopRecord(motor.h * np.arange(len(SETPOINT)), command, speed, SETPOINT)


def trapezoidal(pid: Pid, h: float) -> PidSettings:
    """What the contract's reading calls this controller: Kp h/(2 Ti) apart from the other two rules."""
    half = {"backward": 0.5, "forward": -0.5, "trapezoidal": 0.0}[pid.rule] * pid.Kp * h / pid.Ti
    Kp = pid.Kp + half
    return PidSettings(Kp, Kp * pid.Ti / pid.Kp, pid.Td * pid.Kp / Kp, pid.Tf, pid.b)


def seen(record: LoopRecord) -> Recovered:
    found, said = recover(record)
    assert found is not None, said
    return found


@pytest.mark.parametrize("rule", ["backward", "forward", "trapezoidal"])
@pytest.mark.parametrize("form", [PI, PID], ids=["PI", "PID"])
@pytest.mark.parametrize(
    "trouble",
    [{}, {"low": 38.0, "high": 52.0, "quantum": 0.05}, {"quantum": 0.5}],
    ids=["plain", "limits-with-anti-windup", "coarse-steps"],
)
def test_settings_come_back_in_the_stated_reading(rule: str, form: Pid, trouble: dict[str, float]) -> None:
    # The bars of this project: Kp, Ti within 2 %, Td within 5 %, under measurement noise.
    for seed in (1, 2):
        pid = replace(form, rule=rule, **trouble)
        found, truth = seen(logged(pid, seed, load=1.0)), trapezoidal(pid, MOTOR.h)
        assert found.settings.Kp == pytest.approx(truth.Kp, rel=0.02)
        assert found.settings.Ti == pytest.approx(truth.Ti, rel=0.02)
        assert found.settings.Td == pytest.approx(truth.Td, rel=0.05)
        assert found.settings.b == pytest.approx(1.0, abs=0.05)
        assert found.R2 > 0.99


def test_without_rounding_the_law_comes_back_to_the_last_digits() -> None:
    for pid in (
        PI,
        replace(PI, b=0.4),
        replace(PID, b=0.0),
        replace(PID, c=1.0),
        replace(PI, speed_filter=0.3),
        replace(PID, Tf=0.0, speed_filter=0.1),
        replace(PID, late=2),
        replace(PI, held=5),
    ):
        found, truth = seen(logged(pid)), trapezoidal(pid, MOTOR.h * pid.held)
        assert (found.settings.Kp, found.settings.Ti) == pytest.approx((truth.Kp, truth.Ti), rel=1e-6)
        assert (found.settings.Td, found.settings.b) == pytest.approx((pid.Td, pid.b), rel=1e-5, abs=1e-8)
        assert found.settings.Tf == pytest.approx(pid.speed_filter or pid.Tf, rel=1e-5)
        assert found.late_s == pytest.approx(0.1 * pid.late)
        assert found.period_s == pytest.approx(0.1 * pid.held)
        assert found.form == ("PI" if pid.Td == 0.0 else "PID" if pid.c else "PI-D")


@pytest.mark.parametrize(
    ("pid", "code", "key", "value"),
    [
        (replace(PI, ramp=10.0), "setpoint-ramped", "rate_per_s", 10.0),
        (replace(PID, lag=0.5), "setpoint-filtered", "time_constant_s", 0.5),
        (replace(PI, late=1), "controller-answers-late", "late_s", 0.1),
        (replace(PI, held=4), "controller-slower-than-log", "period_s", 0.4),
    ],
)
def test_what_stands_between_setpoint_and_command_is_named(pid: Pid, code: str, key: str, value: float) -> None:
    found, said = recover(logged(pid))
    (finding,) = [f for f in said if f.code == code]
    assert finding.evidence[key] == pytest.approx(value, rel=0.01)
    assert found is not None
    assert found.settings.Kp == pytest.approx(pid.Kp, rel=0.001)


def test_a_log_that_does_not_show_it_says_why() -> None:
    record = logged(PI)
    rng = np.random.default_rng(3)
    hidden = (
        ("no setpoint", LoopRecord(record.time, record.command, record.speed)),
        ("never moves", LoopRecord(record.time, np.full(2000, 40.0), record.speed, SETPOINT)),
        ("unexplained", LoopRecord(record.time, np.cumsum(rng.standard_normal(2000)), record.speed, SETPOINT)),
        ("too coarse", logged(replace(PI, quantum=2.0))),
        # What the controller saw is not what was logged: another noise on top of the speed.
        ("unexplained", LoopRecord(record.time, record.command, record.speed + rng.standard_normal(2000), SETPOINT)),
    )
    for why, log in hidden:
        found, said = recover(log)
        assert found is None, why
        assert [f.code for f in said] == ["installed-not-visible"]
        assert why in said[0].message


def test_the_intervals_cover_the_truth() -> None:
    inside = 0
    for seed in range(40):
        found = seen(logged(replace(PI, quantum=0.2), seed))
        inside += abs(found.settings.Kp - PI.Kp) <= 1.96 * (found.std["Kp"] or 0.0)
    assert inside >= 34  # 38 of 40 meant; fewer than 34 by chance in 1 of 50


def test_margins_are_those_of_the_difference_equation() -> None:
    # Ms from the closed-loop polynomials themselves, on a grid; stability from their roots.
    plant, settings, h = Fopdt(14.6, 1.83, 0.3), PidSettings(0.12, 2.3, 0.15, 0.05), 0.1
    law = ControlLaw(settings, h, h, "derivative")
    a, p = np.exp(-h / 1.83), 0.05 / 0.15
    integral = np.polymul([0.5 * h / 2.3, 0.5 * h / 2.3], [1.0, -p])
    derivative = (1.0 - p) * 0.15 / h * np.polymul([1.0, -1.0], [1.0, -1.0])
    numerator = 0.12 * (np.polymul([1.0, -1.0], [1.0, -p]) + integral + derivative)
    top = 14.6 * (1.0 - a) * numerator
    bottom = np.polymul(np.polymul([1.0, -a], np.polymul([1.0, -1.0], [1.0, -p])), [1.0, 0.0, 0.0, 0.0, 0.0])
    z = np.exp(1j * np.linspace(1e-4, np.pi, 200_000))
    # Three samples of dead time, one of the hold, one of the controller; numerator and denominator in powers of z.
    loop = np.polyval(top, z) * z / np.polyval(bottom, z) / z**1
    found = law_margins(plant, law)
    assert found.Ms == pytest.approx(np.max(1.0 / np.abs(1.0 + loop)), rel=1e-5)
    assert found.stable == bool(np.all(np.abs(np.roots(np.polyadd(bottom, top))) < 1.0))
    gain = found.gain_margin
    assert gain is not None
    for factor, stable in ((0.99, True), (1.01, False)):
        roots = np.roots(np.polyadd(bottom, factor * gain * top))
        assert bool(np.all(np.abs(roots) < 1.0)) is stable
    quick = ControlLaw(PidSettings(0.05, 2.3), 0.001, 0.0, "none")
    assert law_margins(plant, quick).Ms == pytest.approx(margins(plant, PidSettings(0.05, 2.3)).Ms, rel=1e-2)


def test_the_report_shows_it_and_compares_it_with_what_was_told() -> None:
    record = logged(replace(PI, rule="backward", quantum=0.01))
    report = analyse(record, subspace=False, installed=PidSettings(0.075, 2.3))
    assert report.installed is not None
    assert report.installed.margins is not None
    assert report.installed.margins.stable
    assert report.curves.installed is not None
    assert report.installed.readings["backward"]["Kp"] == pytest.approx(0.075, rel=1e-3)
    codes = {f.code for f in report.findings}
    assert "installed-differs" not in codes
    wrong = analyse(record, subspace=False, installed=PidSettings(0.06, 2.3))
    assert "installed-differs" in {f.code for f in wrong.findings}
    manual = LoopRecord(record.time, record.command, record.speed)
    told = analyse(manual, subspace=False, installed=PidSettings(0.06, 2.3))
    assert told.installed is not None
    assert (told.installed.source, told.installed.settings.Kp) == ("told", 0.06)
    assert analyse(manual, subspace=False).installed is None


def measured(shared: Path, name: str) -> LoopRecord:
    table = np.genfromtxt(shared / "datasets" / f"{name}.csv", delimiter=",", names=True)
    return LoopRecord(table["t_s"], table["command"], table["output"], table["setpoint"])


def test_a_measured_pi(shared: Path) -> None:
    # Source: github daniw/rt-l (Hochschule Luzern, student laboratory report); values in ../shared/datasets/README.md.
    found = seen(measured(shared, "hslu_dcmotor_pi_noload"))
    assert (found.settings.Kp, found.settings.Ti) == pytest.approx((0.004017, 0.1886), rel=0.002)
    assert found.backward is not None
    assert found.forward is not None
    assert (found.backward.Kp, found.backward.Ti) == pytest.approx((0.00391, 0.1836), rel=0.002)
    assert (found.forward.Kp, found.forward.Ti) == pytest.approx((0.00412, 0.1936), rel=0.002)
    assert found.R2 > 0.99999


def test_a_measured_pid_that_saturates(shared: Path) -> None:
    # The same report: Kp = 0.00815, Ti = 0.263 s, Td = 0.0638 s; the bar is 10 %.
    found = seen(measured(shared, "hslu_dcmotor_pid_noload"))
    assert found.settings.Kp == pytest.approx(0.00815, rel=0.02)
    assert found.settings.Ti == pytest.approx(0.263, rel=0.02)
    assert found.settings.Td == pytest.approx(0.0638, rel=0.03)


def test_measured_loops_whose_command_is_cut_to_whole_numbers_are_not_guessed_at(shared: Path) -> None:
    # github opatiny/micromouse: the increments are rounded down at every row, which no linear law tells.
    for name in ("mouse_pid6", "mouse_pid1_limitcycle"):
        assert recover(measured(shared, name))[0] is None, name


def test_controllers_of_all_kinds_come_back_or_are_refused() -> None:
    # A small sample of tests/benchmarks/monte_carlo_installed.py.
    found = main(24, seed=5)
    assert found["wrong"] == 0
    assert found["within"] >= 21
