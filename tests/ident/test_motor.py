"""A motor's nameplate to its transfer function."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.signal import lti

from ident import Fopdt, Motor, Refused, Sopdt, UnderdampedSopdt, from_nameplate

# CHECKS.md section 9; the first is the University of Michigan's tutorial motor.
TUTORIAL = Motor(Kt=0.01, Ke=0.01, R=1.0, L=0.5, J=0.01, b=0.1)
POSITION = Motor(Kt=0.0274, Ke=0.0274, R=4.0, L=2.75e-6, J=3.2284e-6, b=3.5077e-6)


def test_the_tutorial_motor() -> None:
    plant = TUTORIAL.plant()
    assert isinstance(plant, Sopdt)
    assert (-1 / plant.T2, -1 / plant.T1) == pytest.approx((-9.99749922, -2.00250078), abs=5e-9)
    assert (plant.T1, plant.T2) == pytest.approx((0.49937559, 0.10002501), abs=5e-9)
    assert TUTORIAL.gain == pytest.approx(0.0999001, abs=5e-10)
    t = np.linspace(0, 4, 400_001)
    _, y = lti([TUTORIAL.gain], [plant.P, plant.S, 1.0]).step(T=t)
    settled = t[np.flatnonzero(np.abs(y / TUTORIAL.gain - 1) > 0.02)[-1]]
    assert settled == pytest.approx(2.0652, abs=1e-4)


def test_the_position_motor() -> None:
    plant = POSITION.plant()
    assert isinstance(plant, Sopdt)
    assert -1 / plant.T1 == pytest.approx(-59.226, abs=5e-4)
    assert -1 / plant.T2 == pytest.approx(-1.45449e6, rel=4e-6)
    assert POSITION.gain == pytest.approx(35.826791, abs=5e-7)
    assert (POSITION.tau, POSITION.tau_m, POSITION.tau_e) == pytest.approx((0.01688514, 0.01720070, 6.875e-7), rel=1e-6)


def test_a_nameplate() -> None:
    motor = from_nameplate(voltage=24.0, no_load_rpm=3000.0, no_load_current=0.2, R=1.2, L=1.5e-3, J=8e-5)
    assert motor.Ke == motor.Kt == pytest.approx(0.075630429, abs=5e-10)
    assert motor.b == pytest.approx(4.814783e-5, rel=1e-6)
    assert motor.gain == pytest.approx(13.089969, abs=5e-7)
    assert motor.gain * 24.0 * 30 / np.pi == pytest.approx(3000.0)
    plant = motor.plant()
    assert isinstance(plant, Sopdt)
    assert (-1 / plant.T2, -1 / plant.T1) == pytest.approx((-735.10386, -65.497992), rel=1e-8)
    assert (motor.tau, motor.tau_m, motor.tau_e) == pytest.approx((0.016615, 0.016783, 0.00125), abs=5e-7)
    assert motor.stall(24.0) == pytest.approx((1.512609, 20.0), abs=5e-7)
    assert Motor(0.1, 0.1, 1.0, 0.0, 1e-3).rpm_per_volt == pytest.approx(1000 / 10.47198, rel=1e-6)  # 104.7198 Ke


@pytest.mark.parametrize("L", [0.0, 1e-4, 0.5])
def test_the_plant_has_the_transfer_function(L: float) -> None:
    motor = Motor(0.05, 0.05, 1.0, L, 1e-4, 1e-5)
    plant = motor.plant()
    assert isinstance(plant, Fopdt if L == 0 else Sopdt if L == 1e-4 else UnderdampedSopdt)
    s = 1j * np.geomspace(0.1, 1e4, 50)
    exact = motor.Kt / ((motor.J * s + motor.b) * (motor.L * s + motor.R) + motor.Kt * motor.Ke)
    assert np.allclose(plant.frequency_response(s.imag), exact, rtol=1e-10)


def test_impossible_nameplates_are_refused() -> None:
    with pytest.raises(Refused, match="no-load"):
        from_nameplate(voltage=1.0, no_load_rpm=3000.0, no_load_current=2.0, R=1.2, L=0.0, J=8e-5)
    with pytest.raises(Refused, match="SI units"):
        Motor(0.0, 0.1, 1.0, 0.0, 1e-3)
