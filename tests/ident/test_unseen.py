"""A command that moves faster than the log shows is left out, and said to be; one that is held is not."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import ident
from tests.reference.held_fopdt import respond

FINE, EVERY, K, T, L = 0.0005, 20, 2.0, 0.02, 0.005


def codes(fit: ident.Fit) -> set[str]:
    return {f.code for f in fit.findings}


def sweep(top: float) -> ident.LoopRecord:
    """A sine swept from 0 to `top` Hz in 10 s, simulated at 2 kHz, logged at 100 Hz."""
    t = FINE * np.arange(20_000)
    u = np.sin(np.pi * top / 10.0 * t**2)
    y = respond(u, FINE, K, T, L) + 0.02 * np.random.default_rng(0).standard_normal(len(t))
    return ident.LoopRecord(t[::EVERY], u[::EVERY], y[::EVERY])


def test_a_sweep_past_half_the_sample_rate_is_used_up_to_where_it_is_seen() -> None:
    fit = ident.fit(sweep(120.0), "fopdt")
    found = next(f for f in fit.findings if f.code == "command-faster-than-the-log")
    # Seven samples a period, 100/7 Hz, are reached at this share of the sweep; a window finds it a little early.
    assert found.evidence["start_s"] == pytest.approx(100.0 / 7.0 / 120.0 * 10.0, abs=0.2)
    assert np.isnan(fit.simulated[300:900]).all()
    # Straight lines between four to ten samples a period cost some percent of amplitude.
    assert [fit.model.K, fit.model.T] == pytest.approx([K, T], rel=0.06)


def test_a_sweep_that_stays_slow_is_used_whole() -> None:
    assert "command-faster-than-the-log" not in codes(ident.fit(sweep(10.0), "fopdt"))


def test_a_held_command_at_every_row_is_used_whole() -> None:
    rng = np.random.default_rng(1)
    u = rng.choice([-1.0, 1.0], 1000)
    y = respond(u, 0.01, K, T, L) + 0.02 * rng.standard_normal(1000)
    fit = ident.fit(ident.LoopRecord(0.01 * np.arange(1000), u, y), "fopdt")
    assert "command-faster-than-the-log" not in codes(fit)
    assert not np.isnan(fit.simulated[10:]).any()


def test_brushless_motor_swept_past_the_log(shared: Path) -> None:
    # github labmrd/odrive-with-motor-characterization: K = 18.02 (turns/s)/V, T = 0.003 s.
    record = ident.read_csv(shared / "datasets" / "bldc_chirp.csv")
    fit = ident.fit(record, "fopdt")
    assert fit.model.K == pytest.approx(18.02, rel=0.05)
    # Sampled at 4.5 to 10 ms, the motor's 3 ms cannot be told from a dead time: their sum can.
    assert fit.model.T + fit.model.L == pytest.approx(0.003, abs=0.001)
    assert "command-faster-than-the-log" in codes(fit)
