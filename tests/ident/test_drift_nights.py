"""Drift from the logs on: simulated nights through the fit, and the sample nights; more in tests/benchmarks."""

from __future__ import annotations

from pathlib import Path

import pytest

import ident
from tests.benchmarks.drift import PLANTS, found_within_two, unchanged

NIGHTS = Path(__file__).resolve().parents[2] / "sample_logs" / "nights"


@pytest.mark.parametrize(("plant", "base"), [("FOPDT, noise 2", 1), ("SOPDT 1.5 and 0.6, noise 2", 5)])
def test_unchanged_nights_do_not_alarm_and_a_gain_step_is_found(plant: str, base: int) -> None:
    loop, holds = PLANTS[plant]
    said = unchanged(loop, holds, base, series=5, seed=7)
    assert said["moved"] == 0
    assert said["not-moved"] >= 40  # of 50: the verdict is not bought with silence
    assert found_within_two(loop, holds, base, series=8, seed=8, gain=1.2) == 1.0


def test_the_sample_nights_are_called_from_the_eighth_on() -> None:
    # sample_logs/README.md: K falls from 14.6 to 12.6 on the eighth night, nothing else ever.
    fits = {path.stem: ident.fit(ident.read_csv(path), "fopdt") for path in sorted(NIGHTS.glob("*.csv"))}
    names = list(fits)
    assert len(names) == 10
    found = dict(
        ident.drift_history(
            [fits[name] for name in names[:4]],
            [(name, fits[name]) for name in names[4:]],
            settings=ident.PidSettings(0.075, 2.3),
            period=0.1,
        )
    )
    assert [d.verdict for d in found.values()] == ["not-moved"] * 3 + ["moved"] * 3
    last = found["night_10"]
    assert (last.since, last.parameters["K"].since) == ("night_08", "night_08")
    assert last.parameters["K"].change == pytest.approx(11.2 - 14.6, abs=0.15)
    assert {last.parameters[n].verdict for n in ("T", "L")} <= {"not-moved", "no-news"}
    assert last.margin is not None
    assert last.margin.Ms_now is not None
    assert last.margin.Ms_baseline is not None
    assert last.margin.Ms_now < last.margin.Ms_baseline  # less gain, less lively
