"""Manual and automatic: told apart span by span, and both used for what each shows."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from ident import LoopRecord, analyse, fit, read_csv
from ident.estimate import recover
from ident.judge import Operated, mixed, operation, operations
from tests.reference.digital_pid import Motor, Pid, run, steps

ROWS, SWITCH = 1600, 1000
REST = 600.0 / 14.6
SETPOINT = steps(ROWS, ((0, 600.0), (SWITCH + 60, 700.0), (SWITCH + 300, 640.0)))
BY_HAND = np.concatenate(
    (steps(SWITCH, ((0, REST), (150, 44.0), (400, 39.0), (700, 42.0))), np.full(ROWS - SWITCH, np.nan))
)
MOTOR, PI = Motor(noise=1.0), Pid(Kp=0.15, Ti=1.5)


def logged(pid: Pid = PI, seed: int = 1, by_hand: np.ndarray | None = BY_HAND, load: float = 0.4) -> LoopRecord:
    command, speed = run(pid, MOTOR, SETPOINT, seed, by_hand=by_hand, load=load)
    return LoopRecord(MOTOR.h * np.arange(ROWS), command, speed, SETPOINT)


def spans(record: LoopRecord) -> tuple[Operated, ...]:
    return operations(record, recover(record)[0])


@pytest.mark.parametrize(
    "pid",
    [PI, replace(PI, quantum=0.5), replace(PI, held=5), replace(PI, low=39.0, high=46.5), replace(PI, Td=0.2, Tf=0.05)],
    ids=["plain", "coarse", "slower-than-log", "limits", "pid"],
)
def test_manual_and_automatic_are_told_apart_and_named(pid: Pid) -> None:
    record = logged(pid)
    found = spans(record)
    assert [s.operation for s in found] == ["open-loop", "closed-loop"]
    # Under steps of the command and a held period the first automatic move may come a little later than the switch.
    assert found[0].stop == pytest.approx(SWITCH, abs=12)
    assert operation(found) == "closed-loop"
    (said,) = mixed(record, found)
    assert said.code == "manual-and-automatic"
    assert "In manual: 0 to " in said.message
    assert said.evidence["manual_s"] == pytest.approx(100.0, abs=2.0)


def test_one_kind_alone_is_one_span() -> None:
    for record, kind in (
        (logged(by_hand=None), "closed-loop"),
        (logged(by_hand=steps(ROWS, ((0, REST), (150, 44.0), (700, 39.0)))), "open-loop"),
        # At a limit the loop is still in automatic: it pushes, and comes back by itself.
        (logged(replace(PI, high=43.0), by_hand=None), "closed-loop"),
    ):
        assert [s.operation for s in spans(record)] == [kind]
        assert mixed(record, spans(record)) == ()


def test_the_logged_mode_decides_where_there_is_one() -> None:
    record = logged()
    mode = ["MAN"] * 700 + ["AUTO"] * 900
    lines = [
        f"{t:.1f},{r:.3f},{u:.6f},{y:.6f},{m}"
        for t, r, u, y, m in zip(record.time, SETPOINT, record.command, record.speed, mode, strict=True)
    ]
    read = read_csv(("time s,setpoint,command,speed,mode\n" + "\n".join(lines) + "\n").encode())
    found = spans(read)
    assert [(s.operation, s.because, s.stop) for s in found] == [
        ("open-loop", "mode", 700),
        ("closed-loop", "mode", 1600),
    ]


def test_both_parts_are_used() -> None:
    # Truth: K 14.6, T 1.83, L 0.37. The short automatic part is under feedback and the load is slow, so the fit needs a
    # model of the noise; a look at all rows together would miss the feedback in a log that is mostly manual.
    late = np.where(np.arange(ROWS) < 1450, steps(ROWS, ((0, REST), (150, 44.0), (400, 39.0), (700, 42.0))), np.nan)
    setpoint, time = np.where(np.arange(ROWS) < 1480, 600.0, 660.0), MOTOR.h * np.arange(ROWS)
    both, alone = [], []
    for seed in range(10):
        command, speed = run(PI, MOTOR, setpoint, seed, by_hand=late, load=0.4)
        fitted = fit(LoopRecord(time, command, speed, setpoint), "fopdt")
        assert fitted.statistics.noise_order
        for name, truth in (("K", 14.6), ("T", 1.83), ("L", 0.37)):
            estimate = fitted.parameters[name]
            assert estimate.std is not None
            assert abs(estimate.value - truth) < 4.0 * estimate.std
        both.append(fitted.parameters["T"].value)
        manual = slice(0, 1450)
        alone.append(fit(LoopRecord(time[manual], command[manual], speed[manual]), "fopdt").parameters["T"].value)
    off = [float(np.sqrt(np.mean((np.array(values) / 1.83 - 1.0) ** 2))) for values in (both, alone)]
    assert off[0] < 0.5 * off[1]


def test_the_report_says_which_seconds_are_which_and_reads_the_controller_from_its_own() -> None:
    report = analyse(logged(), subspace=False)
    assert [(s.note, s.end_s) for s in report.record.operations] == [
        ("open-loop", pytest.approx(99.9, abs=0.5)),
        ("closed-loop", pytest.approx(159.9)),
    ]
    assert "manual-and-automatic" in {f.code for f in report.findings}
    assert report.installed is not None
    assert (report.installed.settings.Kp, report.installed.settings.Ti) == pytest.approx((0.15, 1.5), rel=1e-3)


def test_measured_loops(shared: Path) -> None:
    # Which were under feedback: ../shared/datasets/README.md.
    for name, kind in (
        ("hslu_dcmotor_pi_noload", "closed-loop"),
        ("hslu_dcmotor_pid_noload", "closed-loop"),
        ("mouse_pid1_limitcycle", "closed-loop"),
        ("hslu_dcmotor_open_noload", "open-loop"),
        ("un_dcmotor_step", "open-loop"),
    ):
        table = np.genfromtxt(shared / "datasets" / f"{name}.csv", delimiter=",", names=True)
        setpoint = table["setpoint"] if "setpoint" in (table.dtype.names or ()) else None
        record = LoopRecord(table["t_s"], table["command"], table["output"], setpoint)
        assert [s.operation for s in spans(record)] == [kind], name


def test_a_command_that_follows_the_setpoint_alone_closes_no_loop() -> None:
    rng = np.random.default_rng(4)
    setpoint = 600.0 + 50.0 * np.repeat(rng.standard_normal(ROWS // 2), 2)
    command, speed = run(PI, MOTOR, setpoint, 1, by_hand=setpoint / 14.6)
    record = LoopRecord(MOTOR.h * np.arange(ROWS), command, speed, setpoint)
    assert recover(record)[0] is None
    assert operation(spans(record)) != "closed-loop"
    fitted = fit(record, "fopdt")
    assert fitted.parameters["T"].value == pytest.approx(1.83, rel=0.05)


def test_a_smooth_command_that_follows_the_setpoint_shows_no_controller() -> None:
    # Drives that turn the speed wanted into a command by a plain factor: the log has r, u and y, and no loop.
    time = MOTOR.h * np.arange(ROWS)
    command = 41.0 + 3.0 * np.sin(0.02 * time * time)
    for noise in (0.0, 0.5):
        _, speed = run(PI, replace(MOTOR, noise=noise), 14.6 * command, 1, by_hand=command)
        found, said = recover(LoopRecord(time, command, speed, 14.6 * command))
        assert found is None
        assert "setpoint alone" in said[0].message
