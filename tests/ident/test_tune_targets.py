"""Targets other than Ms: gain and phase margin, closed-loop time, noise; the PID without the derivative cliff."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy import signal
from tuning_plants import FourLags

from ident.errors import Refused
from ident.loop import PidSettings, margins
from ident.loop.held_plant import held_plant
from ident.plants import Fopdt
from ident.tune import tune
from ident.tune.band import find_band
from ident.tune.ellipses import Limits
from ident.tune.no_cliff import no_cliff
from ident.tune.target import noise_gain

PLANT = Fopdt(1.0, 1.0, 0.2)


class FourUnequal:
    def frequency_response(self, w: Any) -> Any:
        s = 1j * np.asarray(w)
        return 1 / ((1 + s) * (1 + 0.1 * s) * (1 + 0.01 * s) * (1 + 0.001 * s))


def peak(plant: Any, settings: PidSettings) -> float:
    w = np.geomspace(1e-3, 1e5, 200_001)
    controller = settings.frequency_response(w)
    return float(np.max(np.abs(controller / (1 + plant.frequency_response(w) * controller))))


@pytest.mark.parametrize("form", ["pi", "pid"])
def test_gain_and_phase_margin_are_met_and_one_of_them_just(form: str) -> None:
    found = tune(PLANT, gain_margin=3.0, phase_margin_deg=55.0, form=form).margins
    assert found.gain_margin is not None
    assert found.phase_margin_deg is not None
    assert min(found.gain_margin / 3.0, found.phase_margin_deg / 55.0) == pytest.approx(1.0, abs=2e-3)
    assert min(found.gain_margin / 3.0, found.phase_margin_deg / 55.0) >= 1.0


def test_closed_loop_time_sets_the_crossover() -> None:
    found = tune(Fopdt(-2.0, 1.0, 0.2), closed_loop_s=0.3)
    w = 1.0 / (0.3 + 0.2)
    loop = Fopdt(-2.0, 1.0, 0.2).frequency_response(w) * found.settings.frequency_response(w)
    assert abs(loop) == pytest.approx(1.0, rel=2e-3)


@pytest.mark.parametrize("form", ["pi", "pid"])
@pytest.mark.parametrize("plant", [PLANT, Fopdt(1.0, 1.0, 0.0)])
def test_a_limit_on_the_noise_peak_is_kept_and_used(plant: Fopdt, form: str) -> None:
    found = tune(plant, noise_peak=2.0, form=form)
    assert peak(plant, found.settings) == pytest.approx(2.0, rel=1e-4)
    assert found.margins.Ms is not None
    assert found.margins.Ms <= 1.6 + 1e-6


def test_the_noise_of_the_command_is_that_of_a_simulated_loop() -> None:
    # The loop sampled by scipy, white noise of std 0.1 on the speed: an independent way to the command's std.
    plant, h = Fopdt(1.0, 1.0, 0.2), 0.02
    found = tune(plant, command_noise_std=0.12, speed_noise_std=0.1, period=h)
    s = found.settings
    a = np.exp(-h / plant.T)
    plant_num, plant_den = np.concatenate([np.zeros(11), [1 - a]]), np.array([1.0, -a])
    c_num, c_den = s.Kp * np.array([1 + h / (2 * s.Ti), h / (2 * s.Ti) - 1]), np.array([1.0, -1.0])
    closed = np.polyadd(np.convolve(plant_den, c_den)[::-1], np.convolve(plant_num, c_num)[::-1])[::-1]
    num = np.convolve(c_num, plant_den)
    answer = signal.lfilter(num, closed, np.eye(1, 6000)[0])
    assert 0.1 * np.sqrt(np.sum(answer**2)) == pytest.approx(0.12, rel=0.02)
    assert noise_gain(held_plant(plant, h), s, h) == pytest.approx(1.2, rel=2e-3)


@pytest.mark.parametrize(
    ("target", "code", "says"),
    [
        ({"closed_loop_s": 0.001}, "target-unreachable", "fastest"),
        ({"closed_loop_s": 1e4}, "target-unreachable", "slowest"),
        ({"gain_margin": 100.0}, "target-unreachable", "calmest"),
        ({"noise_peak": 0.9}, "target-unreachable", "1/K"),
        ({"command_noise_std": 0.01, "speed_noise_std": 1.0, "period": 0.01}, "target-unreachable", "peaks at"),
        ({"command_noise_std": 0.01}, "target-out-of-range", "speed_noise_std"),
        ({"phase_margin_deg": 95.0}, "target-out-of-range", "below 90"),
    ],
)
def test_what_cannot_be_reached_is_refused_with_what_can(target: dict[str, Any], code: str, says: str) -> None:
    with pytest.raises(Refused, match=says) as caught:
        tune(PLANT, **target)
    assert caught.value.code == code


@pytest.mark.parametrize(
    ("plant", "free", "printed"),
    [
        (FourUnequal(), PidSettings(53.0, 0.0751, 0.0882), (56.9, 0.115, 0.0605)),
        (FourLags(), PidSettings(1.141, 1.708, 1.934), (1.19, 2.22, 1.20)),
    ],
)
def test_no_cliff_gives_the_printed_migo_settings(
    plant: Any, free: PidSettings, printed: tuple[float, float, float]
) -> None:
    # MIGO-PID of Astrom and Hagglund 2004 (CHECKS.md section 2): one circle, M = 1.4, ideal derivative; 0.5 %, and half
    # a unit of the last printed digit.
    band = find_band(held_plant(plant), "pid")
    band = band.with_points(np.geomspace(band.w[0], band.w[-1], 4000))
    found = no_cliff(band, Limits(1.4, ratio=np.inf, combined=True), free)
    assert found is not None
    for value, one, digit in zip((found.Kp, found.Ti, found.Td), printed, (0.05, 0.0005, 0.00005), strict=True):
        assert abs(value - one) <= 0.005 * one + (digit if one < 1 or one > 10 else 0.005)


def test_no_cliff_forgives_more_derivative_than_meant() -> None:
    free = tune(FourLags(), Ms=1.4, form="pid").settings
    calm = no_cliff(find_band(held_plant(FourLags()), "pid"), Limits(1.4), free)
    assert calm is not None

    def worst(s: PidSettings) -> float:
        ahead = [margins(FourLags(), PidSettings(s.Kp, s.Ti, s.Td * f, s.Tf)) for f in (1.0, 1.15)]
        return max(max(m.Ms or np.inf, m.Mt or np.inf) for m in ahead)

    assert 0.6 * free.ki < calm.ki < free.ki
    assert max(margins(FourLags(), calm).Ms or 9, margins(FourLags(), calm).Mt or 9) == pytest.approx(1.4, abs=1e-4)
    assert worst(calm) - 1.4 < 0.5 * (worst(free) - 1.4)
