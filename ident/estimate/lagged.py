"""Lagged: past speeds and commands beside each speed, run by run, and the triangular factor of them all.

Every run starts afresh: a row enters only where its whole history was logged. All a least-squares fit needs of the
rows is the factor R of X = Q R, and the R of many rows is the R of their blocks' R stacked: memory stays small and
cost linear. (Golub and Van Loan, Matrix Computations, section 5.2; Demmel et al. 2012, SIAM J. Sci. Comput. 34.)
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ident.errors import NotIdentifiable
from ident.record import LoopRecord
from ident.record.segments import Floats

SAME_STEP = 0.05  # relative; short runs with rounded stamps know their step no better
USED = 0.5  # share of the segments' rows that must lie on the one grid
BLOCK = 256  # rows factored at a time: they stay in cache
CHUNK = 64  # blocks filled at a time


@dataclass(frozen=True, slots=True, eq=False)
class Run:
    """Rows of one segment: row0 in the record; command and speed (n,) as deviations from the record's means."""

    row0: int
    command: Floats
    speed: Floats

    @property
    def rows(self) -> int:
        return len(self.speed)


@dataclass(frozen=True, slots=True, eq=False)
class Runs:
    """All runs on one sample time, and the means taken off them.

    step  s;  left_out  rows of segments with another sample time or none
    """

    runs: tuple[Run, ...]
    step: float
    command_level: float
    speed_level: float
    left_out: int

    def rows(self, skip: int = 0) -> int:
        """Rows left when each run loses its first `skip`."""
        return sum(max(r.rows - skip, 0) for r in self.runs)

    def first(self, rows: int) -> Runs:
        """The runs that make up the first `rows` rows, the last one cut."""
        kept = []
        for run in self.runs:
            if rows <= 0:
                break
            kept.append(replace(run, command=run.command[:rows], speed=run.speed[:rows]))
            rows -= run.rows
        return replace(self, runs=tuple(kept))

    @property
    def smallest(self) -> float:
        """A residual below this is rounding: 1e-12 of the largest speed as logged."""
        return 1e-12 * max(float(np.abs(r.speed + self.speed_level).max()) for r in self.runs)


def even_runs(record: LoopRecord) -> Runs:
    """The segments of a record that share its sample time.

    Raises NotIdentifiable: irregular-sampling, or not-identifiable where command or speed never moves.
    """
    h = record.sample_time
    total = sum(s.rows for s in record.segments)
    same = [s for s in record.segments if h and s.step is not None and abs(s.step / h - 1.0) <= SAME_STEP]
    rows = sum(s.rows for s in same)
    if h is None or rows < USED * total or rows == 0:
        raise NotIdentifiable(
            "irregular-sampling",
            "An ARX model needs rows on one sample time, and this log's rows are not: log at a fixed period, "
            "or ask for a first- or second-order model, which take each row's own time.",
            {"rows_on_one_sample_time": rows, "rows": total},
        )
    for name, series in (("command", record.command), ("speed", record.speed)):
        values = np.concatenate([series[s.slice] for s in same])
        if float(np.ptp(values)) <= 1e-12 * float(np.abs(values).max()):
            raise NotIdentifiable(
                "not-identifiable",
                f"The {name} never moves, so the log cannot say what the motor does with a command: "
                "log a test in which the command takes at least one clear step and the speed follows.",
                {"constant": name, "rows": rows},
            )
    levels = [float(np.concatenate([v[s.slice] for s in same]).mean()) for v in (record.command, record.speed)]
    runs = tuple(Run(s.start, record.command[s.slice] - levels[0], record.speed[s.slice] - levels[1]) for s in same)
    return Runs(runs, h, levels[0], levels[1], total - rows)


def triangle(runs: Runs, past_speeds: int, command_lags: range, skip: int) -> Floats:
    """R (c, c) of the columns -y[k-1] .. -y[k-past_speeds], u[k-lag] for each lag, 1, y[k].

    skip  rows left out at each run's start, at least the longest lag
    Raises NotIdentifiable too-short where there are not twice as many rows as columns.
    """
    columns = past_speeds + len(command_lags) + 2
    if runs.rows(skip) < 2 * columns:
        raise NotIdentifiable(
            "too-short",
            f"An ARX model of these orders needs {2 * columns} rows after {skip} rows of history, this log has "
            f"{runs.rows(skip)}: log longer without gaps, or ask for lower orders.",
            {"rows_with_history": runs.rows(skip), "needed": 2 * columns},
        )
    factors = []
    for run in runs.runs:
        for start in range(skip, run.rows, BLOCK * CHUNK):
            X = _columns(run, past_speeds, command_lags, start, min(start + BLOCK * CHUNK, run.rows))
            whole = X.shape[1] // BLOCK
            blocks = X[:, : whole * BLOCK].reshape(columns, whole, BLOCK).transpose(1, 2, 0)
            factors.append(np.asarray(np.linalg.qr(blocks, mode="r")).reshape(-1, columns))
            factors.append(X[:, whole * BLOCK :].T)
    return np.asarray(np.linalg.qr(np.vstack(factors), mode="r"))


def _columns(run: Run, past_speeds: int, command_lags: range, start: int, stop: int) -> Floats:
    """Columns (c, stop - start) of rows start..stop-1."""
    X = np.empty((past_speeds + len(command_lags) + 2, stop - start))
    for row, lag in zip(X, range(1, past_speeds + 1), strict=False):
        np.negative(run.speed[start - lag : stop - lag], out=row)
    for row, lag in zip(X[past_speeds:], command_lags, strict=False):
        row[:] = run.command[start - lag : stop - lag]
    X[-2] = 1.0
    X[-1] = run.speed[start:stop]
    return X
