"""Segments: one clock, lost rows, gaps, irregular stamps. Expected splits follow from how the stamps are made."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ident.record import LoopRecord
from ident.record.segments import gaps, runs, spans, uniform_step


def record(time: np.ndarray) -> LoopRecord:
    return LoopRecord(time, np.ones(len(time)), np.ones(len(time)))


@pytest.mark.parametrize("h", [0.01, 0.0107, 0.02, 0.1, 1.0, 9.0])
def test_stamps_rounded_to_milliseconds_are_one_uniform_segment(h: float) -> None:
    r = record(np.round(np.arange(5000) * h + 0.00037, 3))
    assert [(s.start, s.stop) for s in r.segments] == [(0, 5000)]
    assert r.sample_time == pytest.approx(h, rel=2e-6)


def test_exact_grid_gives_its_step_without_rounding_noise() -> None:
    assert record(np.arange(8150) * 0.1).sample_time == 0.1
    assert record(3.0 + np.arange(1221) * 0.01).sample_time == 0.01


@pytest.mark.parametrize("h_ms", [10.0, 10.7, 5.4, 3.3])
def test_a_lost_row_splits_a_steady_clock(h_ms: float) -> None:
    time = np.round(np.arange(400) * h_ms) / 1000
    r = record(np.delete(time, 150))
    assert [(s.start, s.stop) for s in r.segments] == [(0, 150), (150, 399)]


def test_two_gaps_make_three_segments_of_the_same_step() -> None:
    time = np.delete(np.arange(300) * 0.05, np.r_[100:140, 200:203])
    r = record(time)
    assert [(s.start, s.stop, s.step) for s in r.segments] == [(0, 100, 0.05), (100, 160, 0.05), (160, 257, 0.05)]


def test_jittered_clock_is_one_segment_without_a_step() -> None:
    rng = np.random.default_rng(3)
    r = record(np.arange(1000) * 0.005 + rng.uniform(-0.0008, 0.0008, 1000))
    assert [(s.start, s.stop, s.step) for s in r.segments] == [(0, 1000, None)]
    assert r.sample_time is None


@pytest.mark.parametrize(
    ("name", "rows", "step"),
    [("mouse_pid6.csv", 696, None), ("bldc_chirp.csv", 1165, None), ("mouse_pid1_limitcycle.csv", 872, 0.011)],
)
def test_measured_clocks(shared: Path, name: str, rows: int, step: float | None) -> None:
    # ../shared/datasets/README.md calls the first two irregular, the third 0.011 s.
    time = np.loadtxt(shared / "datasets" / name, delimiter=",", skiprows=1, usecols=0)
    assert [(s.start, s.stop, s.step) for s in record(time).segments] == [(0, rows, step)]


def test_step_of_fewer_than_two_rows_is_unknown() -> None:
    assert uniform_step(np.array([1.0])) is None
    assert gaps(np.array([1.0])).tolist() == []


@given(st.lists(st.booleans(), min_size=2, max_size=60), st.integers(0, 2**32 - 1))
def test_runs_cover_the_usable_rows_exactly_and_in_order(flags: list[bool], seed: int) -> None:
    usable = np.array(flags)
    rng = np.random.default_rng(seed)
    time = np.cumsum(rng.choice([0.1, 5.0], size=len(flags), p=[0.9, 0.1]))
    found = runs(usable, tuple(gaps(time).tolist()))
    covered = np.concatenate([np.arange(a, b) for a, b in found] or [np.zeros(0, int)])
    assert covered.tolist() == np.flatnonzero(usable).tolist()
    jumps = set(gaps(time).tolist())
    assert not any(jumps & set(range(a + 1, b)) for a, b in found.tolist())


def test_spans_are_the_runs_of_true() -> None:
    assert spans(np.array([True, True, False, True])).tolist() == [[0, 2], [3, 4]]
    assert spans(np.zeros(3, dtype=bool)).tolist() == []
