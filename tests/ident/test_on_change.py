"""Speeds that are reported on change: only reports are readings, silence is no gap, and a deadband is a noise floor.

Simulated with tests/reference/held_fopdt.py; tests/benchmarks/irregular.py does 200 runs.
"""

from __future__ import annotations

import numpy as np
import pytest

import ident
from ident.record.segments import gaps, outages
from tests.benchmarks.irregular import CLOCK, KINDS, K, L, T, on_change, plant

TRUE = {"K": K, "T": T, "L": L}


def test_without_noise_the_plant_comes_back_exactly() -> None:
    fit = ident.fit(on_change(np.random.default_rng(1), noise=0.0), "fopdt")
    for name, true in TRUE.items():
        # Four decimals were written.
        assert fit.parameters[name].value == pytest.approx(true, rel=1e-4)


def test_the_plant_lies_within_its_intervals() -> None:
    rng = np.random.default_rng(2)
    inside = dict.fromkeys(TRUE, 0)
    for _ in range(30):
        fit = ident.fit(KINDS["on change"](rng), "fopdt")
        for name, true in TRUE.items():
            low, high = fit.parameters[name].ci95
            inside[name] += low is not None and high is not None and low <= true <= high
    # Meant are 95 %: 26 or fewer of 30 would come about once in 16 times (binomial); the seed is fixed.
    assert min(inside.values()) >= 27


def test_a_deadband_is_a_noise_floor_and_no_dead_time_is_finer_than_the_gaps() -> None:
    record = on_change(np.random.default_rng(3), noise=0.0)
    fit = ident.fit(record, "fopdt")
    assert fit.statistics.rms_residual < 1e-3
    assert record.held is not None
    told = ~record.held
    steps = np.diff(record.time[told])
    low, high = fit.parameters["L"].ci95
    assert low is not None
    assert high is not None
    # A dead time anywhere within one gap: standard deviation gap/sqrt(12).
    assert high - low >= 2 * 1.95 * float(np.median(steps)) / 12**0.5
    # A reading rounded to the deadband of 0.1 has that standard deviation; 200 readings of K in moves of about 2.
    assert (fit.parameters["K"].std or 0.0) > 0.1 / 12**0.5 / 2.0 / np.sqrt(told.sum())


def test_rows_that_hold_the_last_report_are_no_readings() -> None:
    record = on_change(np.random.default_rng(4))
    fit = ident.fit(record, "fopdt")
    assert record.held is not None
    assert record.held.sum() > 5
    used = np.isfinite(fit.simulated)
    assert not (used & record.held).any()
    # The first report answers to a command that nobody logged.
    assert fit.statistics.rows_used == int(used.sum()) == int((~record.held).sum()) - 1


def test_silence_is_no_gap_but_an_outage_is() -> None:
    record = on_change(np.random.default_rng(5))
    assert len(gaps(record.time)) > 10  # a plateau says nothing for seconds
    assert len(record.segments) == 1
    assert "gap" not in {f.code for f in record.source.findings}  # type: ignore[union-attr]
    # The same without the rows of some seconds in which the speed went elsewhere.
    rng = np.random.default_rng(6)
    scanned = np.arange(0, len(CLOCK), 10)
    _, y = plant(rng, scanned)
    speed = y[scanned]
    told = np.flatnonzero(np.diff(np.floor(speed / 0.1), prepend=-1) != 0)
    time, value = CLOCK[scanned[told]], speed[told]
    rises = int(np.argmax(np.diff(value, prepend=value[0]) > 0.1))
    kept = np.ones(len(told), dtype=bool)
    kept[rises + 1 : rises + 15] = False
    moved = abs(float(value[kept][rises + 1] - value[kept][rises]))
    time, value = np.where(np.arange(kept.sum()) > rises, time[kept] + 5.0, time[kept]), value[kept]
    found = outages(time, value, np.zeros(len(time), dtype=bool))
    assert moved > 1.0
    assert rises + 1 in found.tolist()
    assert len(found) < 3


@pytest.mark.parametrize(("deadband", "chatters"), [(0.02, True), (0.1, False), (0.4, False)])
def test_a_deadband_within_the_noise_is_said(deadband: float, chatters: bool) -> None:
    # The noise has a standard deviation of 0.02.
    record = on_change(np.random.default_rng(8), deadband=deadband)
    assert record.source is not None
    (said,) = (f for f in record.source.findings if f.code == "exception-reported")
    assert ("turn back" in said.message) == chatters


def test_reports_run_from_reading_to_settings() -> None:
    report = ident.analyse(on_change(np.random.default_rng(7)))
    assert report.selected is not None
    assert report.recommended is not None
    second = ident.fit(on_change(np.random.default_rng(7)), "sopdt")
    assert second.parameters["K"].value == pytest.approx(K, rel=0.02)


def test_flags_of_held_rows_are_checked_and_read_only() -> None:
    t = np.arange(5.0)
    with pytest.raises(ident.IdentError, match="length-mismatch"):
        ident.LoopRecord(t, t, t, held=np.zeros(4, dtype=bool))
    record = ident.LoopRecord(t, t, t, held=np.zeros(5, dtype=bool))
    assert record.held is not None
    with pytest.raises(ValueError, match="read-only"):
        record.held[0] = True
