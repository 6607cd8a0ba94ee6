"""Make the sample logs: a sugared-almond pan, its drum turned by a geared motor.

    python sample_logs/make.py [FOLDER]      # FOLDER: this one, unless named

Seeded, standard library only, and the same bytes on every machine. The plant is simulated here in full,
without the package under test, so that its truth can be believed:

    T dx/dt = -x + K u(t - L),    u held between samples,    y = base + x

Exact over one sample of h seconds with L = (d + phi) h, 0 <= phi < 1: the plant sees u[k-d-1] for the first
phi h seconds and u[k-d] for the rest, so with a = exp(-h/T) and c = exp(-(1-phi) h/T)

    x[k+1] = a x[k] + K (c - a) u[k-d-1] + K (1 - c) u[k-d]
"""

from __future__ import annotations

import math
import random
import sys
from collections.abc import Callable, Generator, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path
from statistics import NormalDist

STEP_S = 0.1  # the panel's cycle, which is also the log's
TACHO_QUANTUM_RPM = 0.5  # 12-bit converter over about 2000 rpm
COMMAND_QUANTUM = 0.01  # what the panel sends and writes down, %
NOISE_RPM = 2.0  # standard deviation: tacho ripple and almonds falling
WINTER = timezone(timedelta(hours=1))


@dataclass(frozen=True)
class Drum:
    """The pan with 120 kg of almonds in it: command in %, motor speed in rpm."""

    K: float = 14.6
    T: float = 1.83
    L: float = 0.37  # drive filter and bus: not a multiple of STEP_S
    base: float = -21.0  # dry friction and slip seen as an offset, rpm


DRUM = Drum()


@dataclass(frozen=True)
class Panel:
    """The installed PI controller; trapezoidal integral, output limits, integral held at a limit."""

    Kp: float
    Ti: float
    low: float = 0.0
    high: float = 100.0


@dataclass(frozen=True)
class Row:
    setpoint: float | None
    command: float
    speed: float


def quantised(value: float, quantum: float) -> float:
    return round(value / quantum) * quantum


def tacho(seed: int) -> Callable[[float], float]:
    """A sensor with its own noise: true speed in, reading out."""
    # random.random is documented to give the same numbers in every Python version; the normal generators of
    # random and numpy are not. So: uniform draws through the normal quantile.
    draw, normal = random.Random(seed), NormalDist()

    def read(speed: float) -> float:
        uniform = min(max(draw.random(), 1e-12), 1 - 1e-12)
        return quantised(speed + NOISE_RPM * normal.inv_cdf(uniform), TACHO_QUANTUM_RPM)

    return read


def plant(drum: Drum, start: float) -> Generator[float, float, None]:
    """True speed at each sample; send the command held until the next. At rest under `start` before."""
    d = math.floor(drum.L / STEP_S)
    phi = drum.L / STEP_S - d
    a = math.exp(-STEP_S / drum.T)
    c = math.exp(-(1 - phi) * STEP_S / drum.T)
    past = [start] * (d + 2)  # newest first: u[k], u[k-1], ... u[k-d-1]
    x = drum.K * start
    while True:
        command = yield drum.base + x
        past = [command, *past[:-1]]
        x = a * x + drum.K * ((c - a) * past[d + 1] + (1 - c) * past[d])


def by_hand(moves: Sequence[tuple[float, float]], seed: int, setpoint: float | None = None) -> list[Row]:
    """Manual operation: (seconds, command) one after the other."""
    commands = [command for seconds, command in moves for _ in range(round(seconds / STEP_S))]
    read, turning = tacho(seed), plant(DRUM, commands[0])
    speed, rows = next(turning), []
    for command in commands:
        rows.append(Row(setpoint, command, read(speed)))
        speed = turning.send(command)
    return rows


def automatic(panel: Panel, moves: Sequence[tuple[float, float]], seed: int, drum: Drum = DRUM) -> list[Row]:
    """Under the panel's PI: (seconds, setpoint) one after the other, at rest before."""
    setpoints = [setpoint for seconds, setpoint in moves for _ in range(round(seconds / STEP_S))]
    rest = (setpoints[0] - drum.base) / drum.K
    read, turning = tacho(seed), plant(drum, rest)
    speed, rows, integral, error_before = next(turning), [], rest, 0.0
    for setpoint in setpoints:
        reading = read(speed)
        error = setpoint - reading
        wanted = integral + panel.Kp * STEP_S / (2 * panel.Ti) * (error + error_before)
        command = quantised(panel.Kp * error + wanted, COMMAND_QUANTUM)
        if panel.low <= command <= panel.high:
            integral = wanted
        command, error_before = min(max(command, panel.low), panel.high), error
        rows.append(Row(setpoint, command, reading))
        speed = turning.send(command)
    return rows


def as_csv(rows: list[Row], start: datetime) -> str:
    """Stamps in ISO 8601 with their offset; comma and point; units in the header."""
    logged_setpoint = rows[0].setpoint is not None
    lines = ["time," + ("setpoint [rpm]," if logged_setpoint else "") + "command [%],speed [rpm]"]
    for k, row in enumerate(rows):
        stamp = (start + timedelta(milliseconds=round(1000 * STEP_S) * k)).isoformat(timespec="milliseconds")
        setpoint = f"{row.setpoint:.1f}," if row.setpoint is not None else ""
        lines.append(f"{stamp.replace('+00:00', 'Z')},{setpoint}{row.command:.2f},{row.speed:.1f}")
    return "\n".join(lines) + "\n"


# Ten nights: the gain of each, as the drive belt begins to slip, and the setpoints of a recipe that changes.
NIGHTS = [
    (14.6, [(8, 600), (21, 680), (15, 640), (16, 600)]),
    (14.6, [(6, 600), (17, 560), (19, 650), (18, 600)]),
    (14.6, [(9, 620), (14, 690), (20, 600), (17, 620)]),
    (14.6, [(7, 600), (23, 660), (14, 700), (16, 600)]),
    (14.6, [(8, 610), (18, 570), (16, 610), (18, 660)]),
    (14.6, [(6, 600), (15, 650), (21, 590), (18, 600)]),
    (14.6, [(9, 600), (19, 690), (16, 630), (16, 600)]),
    (12.6, [(7, 600), (20, 655), (18, 700), (15, 600)]),
    (11.7, [(8, 620), (16, 560), (20, 620), (16, 680)]),
    (11.2, [(6, 600), (22, 670), (15, 610), (17, 600)]),
]


def nights() -> dict[str, str]:
    """The same loop, one log a night: file name to its text."""
    panel, first = Panel(Kp=0.075, Ti=2.3), datetime(2026, 11, 19, 2, 15, tzinfo=WINTER)
    return {
        f"nights/night_{n + 1:02d}.csv": as_csv(
            automatic(panel, recipe, 51 + n, Drum(K=gain)), first + timedelta(days=n, minutes=7 * n % 20)
        )
        for n, (gain, recipe) in enumerate(NIGHTS)
    }


def logs() -> dict[str, str]:
    """Every sample log: file name to its text."""
    staircase = [
        (12, 42),
        (14, 52),
        (12, 46),
        (16, 61),
        (13, 55),
        (17, 38),
        (12, 47),
        (15, 35),
        (14, 50),
        (25, 42),
    ]
    recipe = [(15, 600), (25, 720), (22, 660), (28, 540), (20, 585), (30, 600)]
    return {
        "step_test.csv": as_csv(by_hand(staircase, 41), datetime(2026, 11, 17, 6, 40, tzinfo=WINTER)),
        "setpoint_change.csv": as_csv(
            automatic(Panel(Kp=0.075, Ti=2.3), recipe, 42),
            datetime(2026, 11, 17, 9, 12, 30, tzinfo=UTC),
        ),
        "oscillating.csv": as_csv(
            automatic(Panel(Kp=0.6, Ti=1.1, low=25, high=60), [(10, 600), (80, 640)], 43),
            datetime(2026, 11, 18, 6, 55, tzinfo=WINTER),
        ),
        "nothing_to_learn.csv": as_csv(
            by_hand([(90, 42.5)], 44, setpoint=600), datetime(2026, 11, 18, 13, 5, tzinfo=WINTER)
        ),
        **nights(),
    }


def main(folder: Path) -> None:
    for name, text in logs().items():
        (folder / name).parent.mkdir(exist_ok=True)
        (folder / name).write_bytes(text.encode())


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
