"""ARX as a plant: the difference equation as control theory writes it."""

from __future__ import annotations

import pickle

import control
import numpy as np
import pytest

import ident
from ident.plants.arx import Arx

H = 0.05
PLANT = Arx([-1.7, 0.72], [0.02, 0.03], 5, H)


def test_the_equation_is_the_contracts() -> None:
    u = np.random.default_rng(0).standard_normal(60)
    y = np.zeros(60)
    for k in range(60):
        y[k] = -sum(a * y[k - i] for i, a in enumerate(PLANT.a, 1) if k >= i) + sum(
            b * u[k - PLANT.delay - j] for j, b in enumerate(PLANT.b) if k >= PLANT.delay + j
        )
    assert PLANT.simulate(u) == pytest.approx(y, abs=1e-13)


def test_the_response_is_python_controls() -> None:
    system = control.tf([0.02, 0.03], [1.0, -1.7, 0.72, 0, 0, 0, 0], H)  # b q^-5 + b q^-6 over A, times q^6
    w = np.geomspace(1e-3, np.pi / H, 40)
    assert PLANT.frequency_response(w) == pytest.approx(system(np.exp(1j * H * w)), rel=1e-9)
    assert PLANT.frequency_response(w.reshape(4, 10)).shape == (4, 10)
    assert PLANT.static_gain == pytest.approx(float(np.real(system.dcgain())))
    steps = control.step_response(system, H * np.arange(100))
    assert PLANT.simulate(np.ones(100)) == pytest.approx(np.asarray(steps.outputs).ravel(), abs=1e-9)


def test_dead_time_gain_and_poles() -> None:
    assert PLANT.dead_time == pytest.approx(0.2)
    assert sorted(abs(z) for z in PLANT.poles) == pytest.approx([0.8, 0.9])
    assert PLANT.stable
    assert not Arx([-1.0], [1.0], 1, H).stable
    assert Arx([-1.0], [-1.0], 1, H).static_gain == -np.inf
    assert Arx([], [2.0, 1.0], 1, H).static_gain == 3.0
    assert pickle.loads(pickle.dumps(PLANT)) == PLANT


@pytest.mark.parametrize(
    ("a", "b", "delay", "h"),
    [
        ([-0.9], [0.1], 0, H),
        ([-0.9], [0.1], 1.5, H),
        ([-0.9], [0.0], 1, H),
        ([-0.9], [], 1, H),
        ([np.nan], [1.0], 1, H),
        ([-0.9], [0.1], 1, 0.0),
        ([-0.9], [0.1], np.nan, H),
    ],
)
def test_what_is_no_plant_is_refused(a: list[float], b: list[float], delay: float, h: float) -> None:
    with pytest.raises(ident.Refused) as error:
        Arx(a, b, delay, h)  # type: ignore[arg-type]
    assert error.value.code == "plant-out-of-range"


def test_margins_hold_the_sampling_once() -> None:
    # A first-order plant sampled with its hold, beside the loop that python-control forms from the same parts.
    plant = Arx([-0.9], [0.2], 3, H)
    settings = ident.PidSettings(0.4, 0.5, 0.0, 0.0, 1.0)
    found = ident.margins(plant, settings, period=0.7)  # the period is not added: the plant holds its own
    w = np.linspace(1e-3, np.pi / H, 200_001)
    loop = plant.frequency_response(w) * 0.4 * (1.0 + 1.0 / (0.5j * w))
    assert found.Ms == pytest.approx(float(np.max(1.0 / np.abs(1.0 + loop))), rel=1e-5)
