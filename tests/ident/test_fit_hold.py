"""What the command does between samples: straight lines answered exactly, and chosen where the command is smooth."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import solve_ivp

import ident
from ident.estimate.first_order import FirstOrder
from ident.estimate.layout import lay_out
from ident.estimate.second_order import SecondOrder
from tests.reference.held_fopdt import respond

H, L = 0.1, 0.237


@pytest.mark.parametrize("step", [H, None], ids=["uniform", "irregular"])
@pytest.mark.parametrize("shape", [FirstOrder(0.4), SecondOrder(0.5, 0.05), SecondOrder(0.2, 0.05)])
def test_answer_to_a_straight_command_equals_an_integrated_one(
    shape: FirstOrder | SecondOrder, step: float | None
) -> None:
    t = H * np.arange(200)
    u = 0.3 * np.cumsum(np.random.default_rng(0).standard_normal(200))
    stretch = replace(lay_out(ident.LoopRecord(t, u, np.cos(t))).stretches[0], straight=True, step=step)

    def rates(now: float, state: np.ndarray) -> list[float]:
        drive = np.interp(now - L, t, u) - u[0]
        if isinstance(shape, FirstOrder):
            return [(drive - state[0]) / shape.T]
        return [state[1], (drive - state[0] - shape.S * state[1]) / shape.P]

    states = [0.0] * (1 if isinstance(shape, FirstOrder) else 2)
    # scipy's adaptive Runge-Kutta, kept to the kinks of the command by its largest step.
    integrated = solve_ivp(rates, (0.0, t[-1]), states, t_eval=t, max_step=H / 10, rtol=1e-8, atol=1e-9).y[0]
    answer, slopes, slope_L = shape.answer(stretch, L)
    assert answer == pytest.approx(integrated, abs=2e-5)
    nudged = (shape.answer(stretch, L + 1e-6)[0] - shape.answer(stretch, L - 1e-6)[0]) / 2e-6
    assert slope_L == pytest.approx(nudged, abs=1e-6)
    if isinstance(shape, FirstOrder):
        more, less = (FirstOrder(shape.T * (1 + s)).answer(stretch, L)[0] for s in (1e-6, -1e-6))
        assert slopes[0] == pytest.approx((more - less) / 2e-6, abs=1e-6)


@pytest.mark.parametrize("period", [0.05, 0.1])
def test_a_smooth_command_logged_slowly_keeps_its_dead_time(period: float) -> None:
    # The trial in the issue: a hold assumption turned a true L of 0.05 s into 0.024 (h 0.05) and 0 (h 0.1).
    fine = 0.005
    rng = np.random.default_rng(1)
    u = np.convolve(rng.standard_normal(12_000), np.hanning(200), "same")
    y = respond(u, fine, 2.0, 0.4, 0.05)
    every = round(period / fine)
    rows = len(u[::every])
    record = ident.LoopRecord(period * np.arange(rows), u[::every], y[::every] + 0.2 * rng.standard_normal(rows))
    fit = ident.fit(record, "fopdt")
    assert fit.model.dead_time == pytest.approx(0.05, abs=0.006)
    assert "command-straight-between-samples" in {f.code for f in fit.findings}
    held = ident.fit(record, "fopdt", hold="zero-order")
    assert held.model.dead_time < 0.03


def test_steps_are_held() -> None:
    u = np.repeat(np.random.default_rng(1).choice([-1.0, 1.0], 60), 25)
    record = ident.LoopRecord(0.01 * np.arange(1500), u, respond(u, 0.01, 2.0, 0.5, 0.1053))
    assert ident.fit(record, "fopdt").model.dead_time == pytest.approx(0.1053, rel=1e-6)


def test_an_unknown_hold_is_refused() -> None:
    record = ident.LoopRecord([0.0, 1.0], [0.0, 1.0], [0.0, 1.0])
    with pytest.raises(ident.Refused) as error:
        ident.fit(record, hold="spline")  # type: ignore[arg-type]
    assert error.value.code == "unknown-hold"
