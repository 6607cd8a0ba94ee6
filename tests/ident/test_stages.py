"""The stages of an analysis, told as each begins."""

from __future__ import annotations

from pathlib import Path

import pytest

import ident

SAMPLES = Path(__file__).parents[2] / "sample_logs"


@pytest.mark.parametrize(
    ("name", "stages"),
    [("step_test", ["fitting", "judging", "tuning"]), ("nothing_to_learn", ["fitting", "judging"])],
)
def test_stages_are_told_in_order(name: str, stages: list[str]) -> None:
    record = ident.read_csv(SAMPLES / f"{name}.csv")
    told: list[str] = []
    report = ident.analyse(record, period=0.1, subspace=False, on_stage=told.append)
    assert told == stages
    assert report == ident.analyse(record, period=0.1, subspace=False)
