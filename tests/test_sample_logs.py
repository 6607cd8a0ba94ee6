"""The sample logs: made again byte for byte, the packaged copy the same, read as they were
written, their plant as the README says."""

from __future__ import annotations

import csv
import importlib.util
import io
import sys
from datetime import datetime
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest
from scipy.integrate import solve_ivp

import ident
from service.api.samples import ABOUT

ROOT = Path(__file__).resolve().parents[1]
FOLDER = ROOT / "sample_logs"
NIGHTS = [f"nights/night_{n:02d}.csv" for n in range(1, 11)]
NAMES = [*NIGHTS, "nothing_to_learn.csv", "oscillating.csv", "setpoint_change.csv", "step_test.csv"]


@pytest.fixture(scope="module")
def make() -> ModuleType:
    """sample_logs/make.py as a module; it is a script, not part of any package."""
    spec = importlib.util.spec_from_file_location("sample_logs_make", FOLDER / "make.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module  # dataclasses look their module up
    spec.loader.exec_module(module)
    return module


def test_the_script_makes_the_committed_files(make: ModuleType, tmp_path: Path) -> None:
    make.main(tmp_path)
    assert sorted(str(path.relative_to(tmp_path)) for path in tmp_path.rglob("*.csv")) == NAMES
    for name in NAMES:
        assert (tmp_path / name).read_bytes() == (FOLDER / name).read_bytes(), name


def test_the_packaged_sample_is_the_same_file() -> None:
    packaged = sorted((ROOT / "service" / "page" / "samples").glob("*.csv"))
    assert [path.name for path in packaged] == ["step_test.csv"]
    assert set(ABOUT) == {"step_test.csv"}
    assert packaged[0].read_bytes() == (FOLDER / "step_test.csv").read_bytes()


@pytest.fixture(scope="module")
def written(make: ModuleType) -> dict[str, tuple[list[Any], datetime]]:
    """{name: (rows, time of the first)}, as the script hands them to its writer."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(make, "as_csv", lambda rows, start: (rows, start))
        made: dict[str, tuple[list[Any], datetime]] = make.logs()
        return made


@pytest.mark.parametrize("name", NAMES)
def test_what_is_read_is_what_was_written(name: str, written: dict[str, tuple[list[Any], datetime]]) -> None:
    rows, start = written[name]
    record = ident.read_csv(FOLDER / name)
    assert record.start == start
    np.testing.assert_array_equal(record.time, np.arange(len(rows)) / 10)  # the panel's cycle is 0.1 s
    # To the digits written: two of the command, one of the speeds; decimal rounding is Python's own.
    assert record.command.tolist() == [float(f"{row.command:.2f}") for row in rows]
    assert record.speed.tolist() == [float(f"{row.speed:.1f}") for row in rows]
    if rows[0].setpoint is None:
        assert record.setpoint is None
    else:
        assert record.setpoint is not None
        assert record.setpoint.tolist() == [float(f"{row.setpoint:.1f}") for row in rows]
    assert (record.speed_unit, record.command_unit) == ("rpm", "%")
    assert record.source is not None
    assert record.source.rows == len(rows)
    assert record.excluded == ()
    assert [(s.start, s.stop, s.step) for s in record.segments] == [(0, len(rows), 0.1)]


@pytest.mark.parametrize("name", NAMES)
def test_size_columns_and_even_time(name: str) -> None:
    rows = list(csv.reader(io.StringIO((FOLDER / name).read_text())))
    expected = ["time", "setpoint [rpm]", "command [%]", "speed [rpm]"]
    assert rows[0] == [c for c in expected if not (name == "step_test.csv" and c.startswith("setpoint"))]
    assert 600 <= len(rows) - 1 <= 3000
    stamps = np.array([row[0].removesuffix("Z").removesuffix("+01:00") for row in rows[1:]], dtype="M8[ms]")
    assert set(np.diff(stamps).astype(int)) == {100}


def test_the_plant_is_the_one_the_readme_states(make: ModuleType) -> None:
    # Source: the differential equation itself, integrated by scipy's solve_ivp (error control 1e-9),
    # restarted wherever the delayed command jumps.
    drum, h = make.Drum(), make.STEP_S
    assert (drum.K, drum.T, drum.L) == (14.6, 1.83, 0.37)
    commands = [40.0, 55.0, 55.0, 48.0, 61.0, 61.0, 61.0, 61.0, 30.0, 30.0, 30.0, 30.0]
    simulated, plant = [], make.plant(drum, commands[0])
    speed = next(plant)
    for command in commands:
        simulated.append(speed)
        speed = plant.send(command)
    speed, now, expected = drum.base + drum.K * commands[0], 0.0, {0: drum.base + drum.K * commands[0]}
    marks = sorted({k * h for k in range(len(commands))} | {k * h + drum.L for k in range(len(commands))})
    for until in (mark for mark in marks if mark > 0):
        late = (now + until) / 2 - drum.L
        held = commands[max(int(late // h), 0)] if late >= 0 else commands[0]
        solution = solve_ivp(
            lambda _t, y, held=held: (drum.base + drum.K * held - y) / drum.T,
            (now, until),
            [speed],
            rtol=1e-9,
            atol=1e-9,
        )
        speed, now = float(solution.y[0, -1]), until
        expected[round(until / h, 6)] = speed
    np.testing.assert_allclose(simulated, [expected[k] for k in range(len(commands))], rtol=1e-8)


def test_the_oscillation_lasts(make: ModuleType) -> None:
    rows = list(csv.reader(io.StringIO(make.logs()["oscillating.csv"])))[1:]
    speed = np.array([float(row[3]) for row in rows])
    command = np.array([float(row[2]) for row in rows])
    for window in (slice(200, 400), slice(700, 900)):
        # A swing of 40 rpm has a standard deviation of 28: this is no 2 rpm of noise.
        assert np.std(speed[window]) > 25
        assert command[window].min() == 25
        assert command[window].max() == 60
