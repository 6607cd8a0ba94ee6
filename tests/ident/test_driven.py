"""Only what somebody moved on purpose counts: load noise alone never gives a model or a tuning, setpoint moves do."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import ident
from tests.reference.closed_loop import Loop, simulate

# PI around a FOPDT, load an Ornstein-Uhlenbeck process: simulated step by step, without the package under test.
LOOP = Loop(1.6, 0.8, 0.25, 0.05, 2000, Kp=0.8, Ti=0.9, noise=0.02, load=0.2, load_time=1.0, setpoint_half_period=1e9)


def logs(loop: Loop, runs: int, seed: int = 0) -> list[ident.LoopRecord]:
    return [ident.LoopRecord(*columns) for columns in simulate(loop, runs, seed)]


@pytest.mark.parametrize("load_time", [0.1, 1.0, 20.0])
@pytest.mark.parametrize("noise", [0.0, 0.05])
def test_load_noise_alone_gives_no_model_and_always_advice(load_time: float, noise: float) -> None:
    for log in logs(replace(LOOP, load_time=load_time, noise=noise), 4):
        report = ident.analyse(log, period=0.05, subspace=False)
        assert report.fits == ()
        assert report.tunings == ()
        assert report.recommended is None
        assert not report.record.excitation.sufficient
        assert report.record.advice is not None
        with pytest.raises(ident.IdentError) as refused:
            ident.fit(log)
        assert refused.value.code == "not-identifiable"


def test_setpoint_moves_in_the_same_loop_give_the_model() -> None:
    for log in logs(replace(LOOP, setpoint_half_period=10.0, load=0.05), 3):
        fit = ident.fit(log, "fopdt")
        assert fit.driven is not None
        assert fit.driven.moved_by == "setpoint"
        assert fit.model.K == pytest.approx(1.6, rel=0.1)


def test_setpoint_moves_that_drown_in_the_load_do_not() -> None:
    for log in logs(replace(LOOP, setpoint_half_period=40.0, load=1.5, load_time=5.0), 3):
        assert ident.analyse(log, period=0.05, subspace=False).fits == ()


def test_a_designed_test_stays_within_the_commands_limits() -> None:
    for log in logs(replace(LOOP, load=0.3), 20):
        free = ident.analyse(log, period=0.05, subspace=False).record.advice
        assert free is not None
        if free.size is not None:  # this log suggests a plant, the others only that a test is needed
            break
    assert free.size is not None
    now = float(np.median(log.command))
    held = ident.analyse(
        log, period=0.05, subspace=False, command_limits=(now - 0.2 * free.size, now + 0.5 * free.size)
    ).record.advice
    assert held is not None
    assert held.size is not None
    assert held.repetitions is not None
    assert 0.0 < held.size <= 0.4 * free.size * 1.001
    assert held.repetitions > 2
    # Where there is more room below, the step goes down, and stays above the limit.
    below = ident.analyse(
        log, period=0.05, subspace=False, command_limits=(now - 0.5 * free.size, now + 0.1 * free.size)
    ).record.advice
    assert below is not None
    assert below.size is not None
    assert -0.5 * free.size < below.size < 0.0
    assert below.widths is not None
    assert min(below.widths.values()) > 0.0
    # Room to spare is not used up: the step is the one that is needed.
    spare = ident.analyse(
        log, period=0.05, subspace=False, command_limits=(now - 5.0 * free.size, now + 2.0 * free.size)
    ).record.advice
    assert spare is not None
    assert (spare.size, spare.repetitions, spare.widths) == (-free.size, free.repetitions, free.widths)


@pytest.mark.parametrize("name", ["mouse_pid1_limitcycle", "mouse_pid2_disturbed"])
def test_measured_loops_without_a_setpoint_move_get_no_model(shared: Path, name: str) -> None:
    # github opatiny/micromouse: one swings by itself, the other's wheel was braked by hand; datasets' README.
    report = ident.analyse(ident.read_csv(shared / "datasets" / f"{name}.csv"), subspace=False)
    assert report.fits == ()
    assert report.tunings == ()
    assert report.record.advice is not None
